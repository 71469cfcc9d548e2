import { boundsCentre, checkMesh, volumeOf } from './surface';
import type { SurfaceMeasures, WithCheckpoint } from './types';

/** Insertion sort for the usual short bucket; a hub vertex with hundreds of edges goes to the library. */
function sortRange(values: Float64Array, from: number, to: number): void {
	if (to - from > 64) {
		values.subarray(from, to).sort();
		return;
	}
	for (let i = from + 1; i < to; i++) {
		const x = values[i];
		let j = i - 1;
		while (j >= from && values[j] > x) {
			values[j + 1] = values[j];
			j--;
		}
		values[j + 1] = x;
	}
}

/**
 * Counts the edges by how triangles use them. Directed edges are sorted into buckets by their lower vertex (counting
 * sort), so that the cost is linear and the order of triangles does not matter.
 */
function edgeCounts(vertexCount: number, triangles: Uint32Array) {
	const start = new Uint32Array(vertexCount + 1);
	for (let i = 0; i < triangles.length; i++) {
		const a = triangles[i];
		const b = triangles[i % 3 === 2 ? i - 2 : i + 1];
		if (a !== b) start[(a < b ? a : b) + 1]++;
	}
	for (let v = 0; v < vertexCount; v++) start[v + 1] += start[v];
	const fill = start.slice(0, vertexCount);
	// Other end times two, plus one when the triangle runs from the higher to the lower vertex.
	const ends = new Float64Array(start[vertexCount]);
	for (let i = 0; i < triangles.length; i++) {
		const a = triangles[i];
		const b = triangles[i % 3 === 2 ? i - 2 : i + 1];
		if (a === b) continue;
		if (a < b) ends[fill[a]++] = 2 * b;
		else ends[fill[b]++] = 2 * a + 1;
	}
	let boundary = 0;
	let nonManifold = 0;
	let inconsistent = 0;
	for (let v = 0; v < vertexCount; v++) {
		if (start[v] === start[v + 1]) continue;
		const last = start[v + 1];
		sortRange(ends, start[v], last);
		for (let i = start[v]; i < last;) {
			const other = Math.floor(ends[i] / 2);
			let uses = 0;
			let backward = 0;
			while (i < last && Math.floor(ends[i] / 2) === other) {
				backward += ends[i] % 2;
				uses++;
				i++;
			}
			if (uses === 1) boundary++;
			else if (uses > 2) nonManifold++;
			else if (backward !== 1) inconsistent++;
		}
	}
	return { boundary, nonManifold, inconsistent };
}

/**
 * Area, volume, edges and bounds of a surface.
 * @param positions N x 3, metres (or any unit: results are in its powers)
 * @param triangles F x 3
 * @throws MorphError mesh-shape, mesh-non-finite
 */
export function surfaceMeasures(
	positions: Float64Array,
	triangles: Uint32Array,
	options: WithCheckpoint = {}
): SurfaceMeasures {
	checkMesh(positions, triangles);
	const n = positions.length / 3;
	const used = new Uint8Array(n);
	const min: [number, number, number] = [Infinity, Infinity, Infinity];
	const max: [number, number, number] = [-Infinity, -Infinity, -Infinity];
	let area = 0;
	let degenerate = 0;
	let edgeSum = 0;
	const moment: [number, number, number] = [0, 0, 0];
	for (let i = 0; i < triangles.length; i += 3) {
		const a = triangles[i];
		const b = triangles[i + 1];
		const c = triangles[i + 2];
		used[a] = used[b] = used[c] = 1;
		const ux = positions[3 * b] - positions[3 * a];
		const uy = positions[3 * b + 1] - positions[3 * a + 1];
		const uz = positions[3 * b + 2] - positions[3 * a + 2];
		const vx = positions[3 * c] - positions[3 * a];
		const vy = positions[3 * c + 1] - positions[3 * a + 1];
		const vz = positions[3 * c + 2] - positions[3 * a + 2];
		const x = uy * vz - uz * vy;
		const y = uz * vx - ux * vz;
		const z = ux * vy - uy * vx;
		const doubleArea = Math.sqrt(x * x + y * y + z * z);
		if (doubleArea === 0 || a === b || b === c || c === a) degenerate++;
		area += doubleArea / 2;
		edgeSum +=
			Math.sqrt(ux * ux + uy * uy + uz * uz) +
			Math.sqrt(vx * vx + vy * vy + vz * vz) +
			Math.sqrt((vx - ux) ** 2 + (vy - uy) ** 2 + (vz - uz) ** 2);
		for (let d = 0; d < 3; d++) {
			moment[d] += (doubleArea / 6) * (positions[3 * a + d] + positions[3 * b + d] + positions[3 * c + d]);
		}
	}
	options.checkpoint?.(0.3);
	let unused = 0;
	for (let v = 0; v < n; v++) {
		if (!used[v]) unused++;
		for (let d = 0; d < 3; d++) {
			const value = positions[3 * v + d];
			if (value < min[d]) min[d] = value;
			if (value > max[d]) max[d] = value;
		}
	}
	const edges = edgeCounts(n, triangles);
	options.checkpoint?.(0.9);
	const closed = edges.boundary === 0 && edges.nonManifold === 0 && edges.inconsistent === 0;
	return {
		vertexCount: n,
		triangleCount: triangles.length / 3,
		area,
		volume: volumeOf(positions, triangles, closed ? boundsCentre(positions) : [0, 0, 0]),
		closed,
		boundaryEdges: edges.boundary,
		nonManifoldEdges: edges.nonManifold,
		inconsistentEdges: edges.inconsistent,
		degenerateTriangles: degenerate,
		unusedVertices: unused,
		bounds: { min, max },
		centroid: area > 0 ? [moment[0] / area, moment[1] / area, moment[2] / area] : [min[0], min[1], min[2]],
		meanEdge: edgeSum / triangles.length
	};
}
