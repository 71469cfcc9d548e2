import { pierces } from './crossing';
import { TriangleTree } from './triangle-tree';

export interface SelfIntersectionOptions {
	/** Ids of triangles: only pairs with at least one of them count; default all pairs. */
	chosen?: Uint32Array;
	/** N x 3: pairs that cross at these positions too are counted apart. */
	before?: Float64Array;
	/** Pairs listed at most; default 20. */
	limit?: number;
	/** A tree over all these triangles at about these positions; it is refitted. Default a new one. */
	tree?: TriangleTree;
	/** Asked every few thousand pairs of boxes; true ends the search. */
	stop?: () => boolean;
}

export interface SelfIntersections {
	/** Pairs of triangles that cross, without those of `known`. */
	count: number;
	/** Pairs that crossed before as well. */
	known: number;
	/** Triangle ids, two for each of the first pairs counted. */
	pairs: Uint32Array;
	/** F flags: triangles of the pairs counted. */
	hit: Uint8Array;
	/** Share of the triangles whose pairs among themselves have all been looked at; 1: all. */
	searched: number;
}

const ASKED_EVERY = 4096;

/**
 * Triangles that cross another one: an edge of one passes through the inside of the other. Touching, and lying in one
 * plane, is not crossing. Triangles with a common edge are not compared; of those with a common vertex only the edges
 * opposite to it, the others meet there anyhow. Vertices at the same place count as common.
 *
 * The tree is descended against itself, so that only pairs of boxes that overlap are opened.
 *
 * @param positions N x 3; borrowed
 * @param triangles F x 3; borrowed
 */
export function selfIntersections(
	positions: Float64Array,
	triangles: Uint32Array,
	options: SelfIntersectionOptions = {}
): SelfIntersections {
	const { chosen, before, limit = 20, stop } = options;
	const faces = triangles.length / 3;
	const result = { count: 0, known: 0, pairs: new Uint32Array(0), hit: new Uint8Array(faces), searched: 1 };
	if (faces === 0) return result;
	const tree = options.tree ?? new TriangleTree(positions, triangles);
	if (tree.positions !== positions) tree.refit(positions);
	const { bounds: b, right, first, count, order, corners, points: p, vertices } = tree;
	const then = before && gather(before, vertices);
	const listed: number[] = [];
	// Which nodes hold a chosen triangle: children stand after their parent.
	let flags: Uint8Array | null = null;
	let mark: Uint8Array | null = null;
	if (chosen) {
		mark = new Uint8Array(faces);
		for (let i = 0; i < chosen.length; i++) mark[chosen[i]] = 1;
		flags = new Uint8Array(right.length);
		for (let node = right.length - 1; node >= 0; node--) {
			if (right[node] >= 0) flags[node] = flags[node + 1] | flags[right[node]];
			else {
				for (let i = first[node]; i < first[node] + count[node]; i++) {
					if (mark[order[i]]) flags[node] = 1;
				}
			}
		}
	}
	const test = (i: number, j: number): void => {
		const [s, t] = [order[i], order[j]];
		if (mark && !(mark[s] | mark[t])) return;
		if (!crosses(p, corners, 3 * i, 3 * j)) return;
		if (then && crosses(then, corners, 3 * i, 3 * j)) {
			result.known++;
			return;
		}
		result.count++;
		result.hit[s] = result.hit[t] = 1;
		if (listed.length < 2 * limit) listed.push(s, t);
	};
	const stack: number[] = [0, 0];
	let done = 0;
	let asked = 0;
	while (stack.length > 0) {
		if (stop && ++asked % ASKED_EVERY === 0 && stop()) {
			result.searched = done / faces;
			break;
		}
		const y = stack.pop() as number;
		const x = stack.pop() as number;
		if (flags && !(flags[x] | flags[y])) {
			if (x === y) done = lastOf(x, right, first, count);
			continue;
		}
		if (x === y) {
			if (right[x] < 0) {
				const end = first[x] + count[x];
				for (let i = first[x]; i < end; i++) for (let j = i + 1; j < end; j++) test(i, j);
				done = end;
			} else {
				// Last in, first out: the pair across, then the first half, then the second.
				stack.push(right[x], right[x], x + 1, x + 1, x + 1, right[x]);
			}
			continue;
		}
		const o = 6 * x;
		const q = 6 * y;
		if (
			b[o] > b[q + 3] ||
			b[q] > b[o + 3] ||
			b[o + 1] > b[q + 4] ||
			b[q + 1] > b[o + 4] ||
			b[o + 2] > b[q + 5] ||
			b[q + 2] > b[o + 5]
		)
			continue;
		const leafX = right[x] < 0;
		const leafY = right[y] < 0;
		if (leafX && leafY) {
			const endX = first[x] + count[x];
			const endY = first[y] + count[y];
			for (let i = first[x]; i < endX; i++) for (let j = first[y]; j < endY; j++) test(i, j);
		} else if (leafY || (!leafX && longest(b, o) >= longest(b, q))) stack.push(right[x], y, x + 1, y);
		else stack.push(x, right[y], x, y + 1);
	}
	result.pairs = Uint32Array.from(listed);
	return result;
}

/** Positions in the tree's own order of vertices. */
function gather(positions: Float64Array, vertices: Uint32Array): Float64Array {
	const out = new Float64Array(3 * vertices.length);
	for (let i = 0; i < vertices.length; i++) {
		for (let d = 0; d < 3; d++) out[3 * i + d] = positions[3 * vertices[i] + d];
	}
	return out;
}

function longest(b: Float64Array, o: number): number {
	const x = b[o + 3] - b[o];
	const y = b[o + 4] - b[o + 1];
	const z = b[o + 5] - b[o + 2];
	return x > y ? (x > z ? x : z) : y > z ? y : z;
}

/** End of a node's triangles in the order: that of its last leaf. */
function lastOf(node: number, right: Int32Array, first: Uint32Array, count: Uint32Array): number {
	while (right[node] >= 0) node = right[node];
	return first[node] + count[node];
}

/** Whether the triangles at these offsets into the corners cross. */
function crosses(p: Float64Array, corners: Uint32Array, s: number, t: number): boolean {
	const a0 = 3 * corners[s];
	const a1 = 3 * corners[s + 1];
	const a2 = 3 * corners[s + 2];
	const b0 = 3 * corners[t];
	const b1 = 3 * corners[t + 1];
	const b2 = 3 * corners[t + 2];
	const c0 = a0 === b0 ? 0 : a0 === b1 ? 1 : a0 === b2 ? 2 : -1;
	const c1 = a1 === b0 ? 0 : a1 === b1 ? 1 : a1 === b2 ? 2 : -1;
	const c2 = a2 === b0 ? 0 : a2 === b1 ? 1 : a2 === b2 ? 2 : -1;
	if ((c0 >= 0 ? 1 : 0) + (c1 >= 0 ? 1 : 0) + (c2 >= 0 ? 1 : 0) > 1) return false;
	if (c0 >= 0) return crossAtVertex(p, a0, a1, a2, b0, b1, b2, c0);
	if (c1 >= 0) return crossAtVertex(p, a1, a2, a0, b0, b1, b2, c1);
	if (c2 >= 0) return crossAtVertex(p, a2, a0, a1, b0, b1, b2, c2);
	let size = 0;
	for (let d = 0; d < 3; d++) {
		const x0 = p[a0 + d];
		const x1 = p[a1 + d];
		const x2 = p[a2 + d];
		const y0 = p[b0 + d];
		const y1 = p[b1 + d];
		const y2 = p[b2 + d];
		const low = x0 < x1 ? (x0 < x2 ? x0 : x2) : x1 < x2 ? x1 : x2;
		const high = x0 > x1 ? (x0 > x2 ? x0 : x2) : x1 > x2 ? x1 : x2;
		if ((y0 < low && y1 < low && y2 < low) || (y0 > high && y1 > high && y2 > high)) return false;
		if (high - low > size) size = high - low;
	}
	// Vertices of their own at the same place, as in a mesh that was not welded.
	let shared = 0;
	let sharedA = -1;
	let sharedB = -1;
	for (let i = 0; i < 3; i++) {
		const a = i === 0 ? a0 : i === 1 ? a1 : a2;
		for (let j = 0; j < 3; j++) {
			const b = j === 0 ? b0 : j === 1 ? b1 : b2;
			if (!(p[a] === p[b] && p[a + 1] === p[b + 1] && p[a + 2] === p[b + 2])) continue;
			shared++;
			sharedA = i;
			sharedB = j;
		}
	}
	if (shared > 1) return false;
	if (shared === 1) {
		if (sharedA === 0) return crossAtVertex(p, a0, a1, a2, b0, b1, b2, sharedB);
		if (sharedA === 1) return crossAtVertex(p, a1, a2, a0, b0, b1, b2, sharedB);
		return crossAtVertex(p, a2, a0, a1, b0, b1, b2, sharedB);
	}
	return (
		pierces(p, a0, a1, p, b0, b1, b2, size) ||
		pierces(p, a1, a2, p, b0, b1, b2, size) ||
		pierces(p, a2, a0, p, b0, b1, b2, size) ||
		pierces(p, b0, b1, p, a0, a1, a2, size) ||
		pierces(p, b1, b2, p, a0, a1, a2, size) ||
		pierces(p, b2, b0, p, a0, a1, a2, size)
	);
}

/**
 * Of two triangles with a common vertex, v, a, b and the one with corners b0, b1, b2 whose corner `at` lies at v, only the
 * edges opposite to it can cross.
 */
function crossAtVertex(
	p: Float64Array,
	v: number,
	a: number,
	b: number,
	b0: number,
	b1: number,
	b2: number,
	at: number
): boolean {
	const c = at === 0 ? b1 : at === 1 ? b2 : b0;
	const d = at === 0 ? b2 : at === 1 ? b0 : b1;
	const x = p[v];
	const y = p[v + 1];
	const z = p[v + 2];
	const ax = p[a] - x;
	const ay = p[a + 1] - y;
	const az = p[a + 2] - z;
	const bx = p[b] - x;
	const by = p[b + 1] - y;
	const bz = p[b + 2] - z;
	const cx = p[c] - x;
	const cy = p[c + 1] - y;
	const cz = p[c + 2] - z;
	const dx = p[d] - x;
	const dy = p[d + 1] - y;
	const dz = p[d + 2] - z;
	// Seen from each triangle's plane: both ends of the other's edge on one side means that it does not pass.
	const mx = ay * bz - az * by;
	const my = az * bx - ax * bz;
	const mz = ax * by - ay * bx;
	const first = (mx * cx + my * cy + mz * cz) * (mx * dx + my * dy + mz * dz) < 0;
	const nx = cy * dz - cz * dy;
	const ny = cz * dx - cx * dz;
	const nz = cx * dy - cy * dx;
	const second = (nx * ax + ny * ay + nz * az) * (nx * bx + ny * by + nz * bz) < 0;
	if (!first && !second) return false;
	const size = Math.max(Math.abs(ax), Math.abs(ay), Math.abs(az), Math.abs(bx), Math.abs(by), Math.abs(bz));
	return (second && pierces(p, a, b, p, b0, b1, b2, size)) || (first && pierces(p, c, d, p, v, a, b, size));
}
