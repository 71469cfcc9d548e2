import { edgeTable, weldTriangles, type Patch } from '$lib/morph';
import { findDuplicates, isDegenerate } from './mesh-checks';
import { examineParts } from './parts';

/** What a repair takes; borrowed, never changed. */
export interface RepairMesh {
	positions: Float32Array;
	triangles: Uint32Array;
	patches: Patch[];
	attributes?: Uint16Array | null;
}

export interface RepairResult {
	/** Fresh arrays where something changed, else the given ones. */
	mesh: RepairMesh;
	/** For each old triangle its new number, or -1. */
	triangleMap: Int32Array;
	/** For each old vertex its new number. */
	vertexMap: Uint32Array;
	/** Triangles turned, dropped, or vertices joined. */
	changed: number;
	/** What was done, as a sentence. */
	text: string;
}

const identity = (n: number) => Int32Array.from({ length: n }, (_, i) => i);
const sameVertices = (mesh: RepairMesh) => Uint32Array.from({ length: mesh.positions.length / 3 }, (_, i) => i);

function drop(mesh: RepairMesh, gone: (t: number) => boolean, text: (n: number) => string): RepairResult {
	const faces = mesh.triangles.length / 3;
	const triangleMap = new Int32Array(faces);
	let kept = 0;
	for (let t = 0; t < faces; t++) triangleMap[t] = gone(t) ? -1 : kept++;
	const changed = faces - kept;
	if (changed === 0) return { mesh, triangleMap, vertexMap: sameVertices(mesh), changed, text: text(0) };
	const triangles = new Uint32Array(3 * kept);
	const attributes = mesh.attributes ? new Uint16Array(kept) : null;
	for (let t = 0; t < faces; t++) {
		const to = triangleMap[t];
		if (to < 0) continue;
		for (let k = 0; k < 3; k++) triangles[3 * to + k] = mesh.triangles[3 * t + k];
		if (attributes) attributes[to] = mesh.attributes![t];
	}
	let first = 0;
	const patches = mesh.patches.map((patch) => {
		let count = 0;
		for (let t = patch.firstTriangle; t < patch.firstTriangle + patch.triangleCount; t++)
			if (triangleMap[t] >= 0) count++;
		const moved = { name: patch.name, firstTriangle: first, triangleCount: count };
		first += count;
		return moved;
	});
	return {
		mesh: { positions: mesh.positions, triangles, patches, attributes },
		triangleMap,
		vertexMap: sameVertices(mesh),
		changed,
		text: text(changed)
	};
}

/** Without the triangles that have two equal corners or no area. Vertices keep their numbers, also those left unused. */
export const dropDegenerate = (mesh: RepairMesh): RepairResult =>
	drop(
		mesh,
		(t) => isDegenerate(mesh, t),
		(n) => `${n} triangles without area were dropped.`
	);

/** Without the triangles that repeat an earlier one the same way round; sheets back to back are kept. */
export function dropDuplicates(mesh: RepairMesh): RepairResult {
	const { of, same } = findDuplicates(mesh.triangles, mesh.positions.length / 3);
	return drop(
		mesh,
		(t) => of[t] >= 0 && same[t] === 1,
		(n) => `${n} repeated triangles were dropped.`
	);
}

/** Joins vertices of equal place (to the bit; -0 is 0); numbered by first appearance. Triangles keep their order. */
export function weld(mesh: RepairMesh): RepairResult {
	const welded = weldTriangles(mesh.positions);
	const changed = (mesh.positions.length - welded.positions.length) / 3;
	return {
		mesh: {
			...mesh,
			positions: welded.positions,
			triangles: Uint32Array.from(mesh.triangles, (v) => welded.triangles[v])
		},
		triangleMap: identity(mesh.triangles.length / 3),
		vertexMap: welded.triangles,
		changed,
		text: `${changed} vertices were joined to others at the same place.`
	};
}

/**
 * Turns triangles so that neighbours agree, part by part: each follows the majority of its area, and closed parts face
 * outward, unless they are walls of cavities inside of other parts. Edges of more than two triangles are not crossed.
 */
export function reorient(mesh: RepairMesh): RepairResult {
	const { triangles } = mesh;
	const vertexCount = mesh.positions.length / 3;
	const faces = triangles.length / 3;
	const edges = edgeTable(triangles, vertexCount);
	const seen = new Uint8Array(faces);
	const turned = new Uint8Array(faces);
	const queue = new Uint32Array(faces);
	let conflicts = 0;
	for (let seed = 0; seed < faces; seed++) {
		if (seen[seed]) continue;
		let filled = 0;
		queue[filled++] = seed;
		seen[seed] = 1;
		const area = [0, 0];
		for (let i = 0; i < filled; i++) {
			const t = queue[i];
			area[turned[t]] += areaOf(mesh, t);
			for (let k = 0; k < 3; k++) {
				const other = edges.opposite[3 * t + k];
				if (other < 0) continue;
				const o = (other / 3) | 0;
				const wanted = turned[t] ^ edges.against[3 * t + k];
				if (!seen[o]) {
					seen[o] = 1;
					turned[o] = wanted;
					queue[filled++] = o;
				} else if (turned[o] !== wanted) conflicts++;
			}
		}
		if (area[1] > area[0]) for (let i = 0; i < filled; i++) turned[queue[i]] ^= 1;
	}
	const result = Uint32Array.from(triangles);
	const turn = (t: number) => {
		const b = result[3 * t + 1];
		result[3 * t + 1] = result[3 * t + 2];
		result[3 * t + 2] = b;
	};
	for (let t = 0; t < faces; t++) if (turned[t]) turn(t);
	const { of, parts } = examineParts({ positions: mesh.positions, triangles: result });
	const inward = parts.map((part) => part.closed && part.consistent && part.volume < 0 && !part.cavity);
	for (let t = 0; t < faces; t++) if (inward[of[t]]) turn(t);
	let changed = 0;
	for (let t = 0; t < faces; t++) if (result[3 * t + 1] !== triangles[3 * t + 1]) changed++;
	const rest = conflicts > 0 ? ` ${conflicts / 2} edges of a one-sided part cannot agree.` : '';
	return {
		mesh: { ...mesh, triangles: result },
		triangleMap: identity(faces),
		vertexMap: sameVertices(mesh),
		changed,
		text: `${changed} triangles were turned.${rest}`
	};
}

function areaOf({ positions: p, triangles }: RepairMesh, t: number): number {
	const [a, b, c] = [3 * triangles[3 * t], 3 * triangles[3 * t + 1], 3 * triangles[3 * t + 2]];
	const [ux, uy, uz] = [p[b] - p[a], p[b + 1] - p[a + 1], p[b + 2] - p[a + 2]];
	const [vx, vy, vz] = [p[c] - p[a], p[c + 1] - p[a + 1], p[c + 2] - p[a + 2]];
	return 0.5 * Math.hypot(uy * vz - uz * vy, uz * vx - ux * vz, ux * vy - uy * vx);
}
