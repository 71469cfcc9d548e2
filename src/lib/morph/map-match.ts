import { BufferAttribute, BufferGeometry, Triangle, Vector3 } from 'three';
import { MeshBVH } from 'three-mesh-bvh';
import { MorphError } from './errors';
import { PointGrid } from './point-grid';
import type { MapMatch, MapTable, MatchOptions, Mesh } from './types';

const DEFAULT_TOLERANCE = 1e-5;
const DEFAULT_LIMIT_EDGES = 2;
const LISTED_ROWS = 20;
const CHECKPOINT_ROWS = 1 << 14;

/** Lumped areas by vertex and face, and the mean edge, in the mesh's own unit. */
function meshSizes(mesh: Pick<Mesh, 'positions' | 'triangles'>) {
	const { positions: p, triangles } = mesh;
	const faces = new Float64Array(triangles.length / 3);
	const vertices = new Float64Array(p.length / 3);
	let edges = 0;
	for (let t = 0; t < faces.length; t++) {
		const [a, b, c] = [3 * triangles[3 * t], 3 * triangles[3 * t + 1], 3 * triangles[3 * t + 2]];
		const ux = p[b] - p[a];
		const uy = p[b + 1] - p[a + 1];
		const uz = p[b + 2] - p[a + 2];
		const vx = p[c] - p[a];
		const vy = p[c + 1] - p[a + 1];
		const vz = p[c + 2] - p[a + 2];
		faces[t] = 0.5 * Math.hypot(uy * vz - uz * vy, uz * vx - ux * vz, ux * vy - uy * vx);
		edges += Math.hypot(ux, uy, uz) + Math.hypot(vx, vy, vz) + Math.hypot(vx - ux, vy - uy, vz - uz);
		for (const v of [a, b, c]) vertices[v / 3] += faces[t] / 3;
	}
	return { faces, vertices, meanEdge: edges / triangles.length };
}

function diagonal(positions: Float32Array): number {
	let sum = 0;
	for (let d = 0; d < 3; d++) {
		let low = Infinity;
		let high = -Infinity;
		for (let i = d; i < positions.length; i += 3) {
			low = Math.min(low, positions[i]);
			high = Math.max(high, positions[i]);
		}
		sum += (high - low) ** 2;
	}
	return Math.sqrt(sum);
}

function centroids(mesh: Pick<Mesh, 'positions' | 'triangles'>): Float64Array {
	const out = new Float64Array(mesh.triangles.length);
	for (let i = 0; i < out.length; i++) {
		const t = i - (i % 3);
		const d = i % 3;
		for (let k = 0; k < 3; k++) out[i] += mesh.positions[3 * mesh.triangles[t + k] + d] / 3;
	}
	return out;
}

/**
 * Brings a table of points onto a mesh. Each row goes to the vertex (location 'face': the triangle by its centroid)
 * within the tolerance; else to the nearest point on the surface, shared among its corners by barycentric weights; else,
 * beyond the limit, nowhere, and is counted.
 *
 * Several rows at one place: densities are averaged by weight; nodal derivatives and vectors are added, so that their
 * total is conserved. Vertices (faces) that no row reached hold 0 and are counted.
 *
 * @param table points in the mesh's length unit; borrowed
 * @throws MorphError map-shape when the table's components do not fit the kind; map-unmatched when no row fits
 */
export function matchMap(
	table: Pick<MapTable, 'points' | 'values' | 'components'>,
	mesh: Pick<Mesh, 'positions' | 'triangles'>,
	options: MatchOptions
): MapMatch {
	const { location, kind, checkpoint } = options;
	const { points, values, components } = table;
	if ((kind === 'vector') !== (components === 3)) {
		throw new MorphError(
			'map-shape',
			`The file has ${components === 3 ? 'three values' : 'one value'} per point, but the kind is "${kind}".`,
			components === 3 ? 'Choose the kind "vector".' : 'Choose the kind "density" or "nodal".'
		);
	}
	const rows = points.length / 3;
	const sizes = meshSizes(mesh);
	const tolerance = options.tolerance ?? DEFAULT_TOLERANCE * diagonal(mesh.positions);
	const limit = Math.max(options.limit ?? DEFAULT_LIMIT_EDGES * sizes.meanEdge, tolerance);
	const areas = location === 'vertex' ? sizes.vertices : sizes.faces;
	const places = location === 'vertex' ? Float64Array.from(mesh.positions) : centroids(mesh);
	const out = new Float64Array(areas.length * components);
	const weights = new Float64Array(areas.length);
	const give = (place: number, row: number, weight: number) => {
		weights[place] += weight;
		for (let c = 0; c < components; c++) out[components * place + c] += weight * values[components * row + c];
	};
	const distances = new Float64Array(rows);
	const far: number[] = [];
	const rest: number[] = [];
	const grid = new PointGrid(places, tolerance);
	for (let row = 0; row < rows; row++) {
		const place = grid.nearest(points[3 * row], points[3 * row + 1], points[3 * row + 2], row);
		if (place >= 0) {
			give(place, row, 1);
			distances[row] = grid.distance;
		} else rest.push(row);
		if (checkpoint && row % CHECKPOINT_ROWS === 0) checkpoint((0.4 * row) / rows);
	}
	const exact = rows - rest.length;
	if (rest.length > 0) {
		const geometry = new BufferGeometry();
		geometry.setAttribute('position', new BufferAttribute(mesh.positions, 3));
		geometry.setIndex(new BufferAttribute(mesh.triangles, 1));
		// Indirect: the tree sorts its own list and leaves the mesh's triangle order alone.
		const tree = new MeshBVH(geometry, { indirect: true });
		checkpoint?.(0.5);
		const point = new Vector3();
		const corner = [new Vector3(), new Vector3(), new Vector3()];
		const share = new Vector3();
		const hit = { point: new Vector3(), distance: 0, faceIndex: 0 };
		rest.forEach((row, k) => {
			point.set(points[3 * row], points[3 * row + 1], points[3 * row + 2]);
			const found = tree.closestPointToPoint(point, hit, 0, limit * (1 + 1e-9));
			if (!found || !(found.distance <= limit)) {
				far.push(row);
				return;
			}
			distances[row] = found.distance;
			const t = found.faceIndex;
			if (location === 'face') give(t, row, 1);
			else {
				corner.forEach((v, j) => v.fromArray(mesh.positions, 3 * mesh.triangles[3 * t + j]));
				const inside = Triangle.getBarycoord(found.point, corner[0], corner[1], corner[2], share);
				// A triangle without area has no barycentric weights: the nearest corner takes all.
				if (!inside || !Number.isFinite(share.x + share.y + share.z)) {
					const near = corner.map((v) => v.distanceToSquared(found.point));
					give(mesh.triangles[3 * t + near.indexOf(Math.min(...near))], row, 1);
				} else {
					// Clamped against roundoff and divided by the sum, so that the shares add up to 1.
					const s = [share.x, share.y, share.z].map((w) => Math.max(0, w));
					const sum = s[0] + s[1] + s[2];
					for (let j = 0; j < 3; j++) if (s[j] > 0) give(mesh.triangles[3 * t + j], row, s[j] / sum);
				}
			}
			if (checkpoint && k % CHECKPOINT_ROWS === 0) checkpoint(0.5 + (0.5 * k) / rest.length);
		});
	}
	const matched = rows - far.length;
	if (matched === 0) {
		throw new MorphError(
			'map-unmatched',
			`None of the ${rows} points lies within ${limit.toPrecision(3)} length units of the surface.`,
			"Check that the file belongs to this shape and has the study's length unit and coordinate frame."
		);
	}
	let without = 0;
	let covered = 0;
	let area = 0;
	for (let i = 0; i < areas.length; i++) {
		area += areas[i];
		if (weights[i] === 0) {
			without++;
			continue;
		}
		covered += areas[i];
		if (kind === 'density') for (let c = 0; c < components; c++) out[components * i + c] /= weights[i];
	}
	const skipped = new Set(far);
	const used = distances.filter((_, row) => !skipped.has(row)).sort();
	const percentile = (q: number) => used[Math.min(used.length - 1, Math.floor(q * used.length))];
	checkpoint?.(1);
	return {
		values: out,
		location,
		kind,
		components,
		matched,
		exact,
		unmatched: far.length,
		unmatchedRows: far.slice(0, LISTED_ROWS).map((row) => row + 1),
		maxDistance: used[used.length - 1],
		distancePercentiles: { p50: percentile(0.5), p90: percentile(0.9), p99: percentile(0.99) },
		coverage: area > 0 ? covered / area : 0,
		withoutValue: without,
		unmatchedArea: area - covered
	};
}
