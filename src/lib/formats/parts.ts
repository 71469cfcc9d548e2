import { edgeTable, type EdgeTable } from '$lib/morph';
import { partsOf } from './half-edges';
import type { HealthMesh } from './mesh-checks';

export interface PartHealth {
	triangles: number;
	closed: boolean;
	/** Every edge is used once in each direction. */
	consistent: boolean;
	/** Signed, file's unit cubed; of closed parts. */
	volume: number;
	/** Lies inside another closed part, so that inward is right. */
	cavity: boolean;
	firstTriangle: number;
}

function partVolumes({ positions: p, triangles }: HealthMesh, partOf: Uint32Array, count: number): Float64Array {
	const volume = new Float64Array(count);
	const origin = new Float64Array(3 * count).fill(NaN);
	for (let t = 0; t < partOf.length; t++) {
		const part = partOf[t];
		const [a, b, c] = [3 * triangles[3 * t], 3 * triangles[3 * t + 1], 3 * triangles[3 * t + 2]];
		if (Number.isNaN(origin[3 * part])) for (let d = 0; d < 3; d++) origin[3 * part + d] = p[a + d];
		const [ox, oy, oz] = [origin[3 * part], origin[3 * part + 1], origin[3 * part + 2]];
		const [ax, ay, az] = [p[a] - ox, p[a + 1] - oy, p[a + 2] - oz];
		const [bx, by, bz] = [p[b] - ox, p[b + 1] - oy, p[b + 2] - oz];
		const [cx, cy, cz] = [p[c] - ox, p[c + 1] - oy, p[c + 2] - oz];
		volume[part] += (ax * (by * cz - bz * cy) + ay * (bz * cx - bx * cz) + az * (bx * cy - by * cx)) / 6;
	}
	return volume;
}

/** In how many of the parts asked for a point lies, whichever way they face: solid angles of van Oosterom, Strackee 1983. */
function nesting({ positions: p, triangles }: HealthMesh, partOf: Uint32Array, asked: Uint8Array, q: number): number {
	const sum = new Float64Array(asked.length);
	for (let t = 0; t < partOf.length; t++) {
		if (!asked[partOf[t]]) continue;
		const [i, j, k] = [3 * triangles[3 * t], 3 * triangles[3 * t + 1], 3 * triangles[3 * t + 2]];
		const [ax, ay, az] = [p[i] - p[q], p[i + 1] - p[q + 1], p[i + 2] - p[q + 2]];
		const [bx, by, bz] = [p[j] - p[q], p[j + 1] - p[q + 1], p[j + 2] - p[q + 2]];
		const [cx, cy, cz] = [p[k] - p[q], p[k + 1] - p[q + 1], p[k + 2] - p[q + 2]];
		const [a, b, c] = [Math.hypot(ax, ay, az), Math.hypot(bx, by, bz), Math.hypot(cx, cy, cz)];
		const triple = ax * (by * cz - bz * cy) + ay * (bz * cx - bx * cz) + az * (bx * cy - by * cx);
		const [ab, bc, ca] = [ax * bx + ay * by + az * bz, bx * cx + by * cy + bz * cz, cx * ax + cy * ay + cz * az];
		sum[partOf[t]] += 2 * Math.atan2(triple, a * b * c + ab * c + bc * a + ca * b);
	}
	return sum.reduce((depth, angle) => depth + (Math.round(Math.abs(angle) / (4 * Math.PI)) % 2), 0);
}

/** Triangle visits that telling cavities apart may take: some seconds. */
const MAX_NESTING_WORK = 1e8;

function partBounds({ positions: p, triangles }: HealthMesh, partOf: Uint32Array, count: number): Float64Array {
	const bounds = new Float64Array(6 * count);
	for (let k = 0; k < count; k++) bounds.fill(Infinity, 6 * k, 6 * k + 3).fill(-Infinity, 6 * k + 3, 6 * k + 6);
	for (let i = 0; i < triangles.length; i++) {
		const at = 6 * partOf[(i / 3) | 0];
		for (let d = 0; d < 3; d++) {
			const x = p[3 * triangles[i] + d];
			if (x < bounds[at + d]) bounds[at + d] = x;
			if (x > bounds[at + 3 + d]) bounds[at + 3 + d] = x;
		}
	}
	return bounds;
}

/** Marks the closed inward parts that lie inside of an odd number of others. Returns how many there was no time to tell. */
function findCavities(mesh: HealthMesh, partOf: Uint32Array, parts: PartHealth[]): number {
	const usable = parts.map((part) => part.closed && part.consistent);
	const inward = parts.map((part, k) => (usable[k] && part.volume < 0 ? k : -1)).filter((k) => k >= 0);
	if (parts.length < 2 || inward.length === 0) return 0;
	const bounds = partBounds(mesh, partOf, parts.length);
	let work = 0;
	let untold = 0;
	for (const k of inward) {
		work += parts.length;
		const asked = new Uint8Array(parts.length);
		let any = false;
		for (let o = 0; o < parts.length; o++) {
			if (o === k || !usable[o]) continue;
			let inside = true;
			for (let d = 0; d < 3 && inside; d++) {
				inside = bounds[6 * o + d] <= bounds[6 * k + d] && bounds[6 * o + 3 + d] >= bounds[6 * k + 3 + d];
			}
			if (!inside) continue;
			asked[o] = 1;
			any = true;
		}
		if (!any) continue;
		work += partOf.length;
		if (work > MAX_NESTING_WORK) {
			untold++;
			continue;
		}
		parts[k].cavity = nesting(mesh, partOf, asked, 3 * mesh.triangles[3 * parts[k].firstTriangle]) % 2 === 1;
	}
	return untold;
}

/** What is known of each part; cavities are closed inward parts inside of others. */
export function examineParts(mesh: HealthMesh): {
	of: Uint32Array;
	parts: PartHealth[];
	edges: EdgeTable;
	/** Inward parts that there was no time to look around: counted as no cavities. */
	untoldCavities: number;
} {
	const { triangles } = mesh;
	const vertexCount = mesh.positions.length / 3;
	const edges = edgeTable(triangles, vertexCount);
	const { of, count } = partsOf(triangles, edges, vertexCount);
	const volume = partVolumes(mesh, of, count);
	const parts: PartHealth[] = Array.from({ length: count }, (_, k) => ({
		triangles: 0,
		closed: true,
		consistent: true,
		volume: volume[k],
		cavity: false,
		firstTriangle: -1
	}));
	for (let t = 0; t < of.length; t++) {
		const part = parts[of[t]];
		part.triangles++;
		if (part.firstTriangle < 0) part.firstTriangle = t;
		for (let k = 0; k < 3; k++) {
			if (edges.open[3 * t + k] || edges.crowded[3 * t + k]) part.closed = false;
			if (edges.against[3 * t + k]) part.consistent = false;
		}
	}
	return { of, parts, edges, untoldCavities: findCavities(mesh, of, parts) };
}
