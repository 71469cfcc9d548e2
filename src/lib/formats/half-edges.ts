import type { EdgeTable } from '$lib/morph';

/**
 * Parts: triangles that hang together over edges, whatever their orientation.
 * @returns the part of each triangle, numbered by first appearance
 */
export function partsOf(
	triangles: Uint32Array,
	edges: EdgeTable,
	vertexCount: number
): { of: Uint32Array; count: number } {
	const faces = triangles.length / 3;
	const parent = new Uint32Array(faces);
	for (let t = 0; t < faces; t++) parent[t] = t;
	const root = (t: number) => {
		while (parent[t] !== t) {
			parent[t] = parent[parent[t]];
			t = parent[t];
		}
		return t;
	};
	const join = (a: number, b: number) => {
		const [x, y] = [root(a), root(b)];
		if (x < y) parent[y] = x;
		else parent[x] = y;
	};
	/** Crowded edges join all their triangles: the first one seen by key. */
	const crowded = new Map<number, number>();
	for (let e = 0; e < triangles.length; e++) {
		const t = (e / 3) | 0;
		if (edges.opposite[e] > e) join(t, (edges.opposite[e] / 3) | 0);
		else if (edges.crowded[e]) {
			const a = triangles[e];
			const b = triangles[e % 3 === 2 ? e - 2 : e + 1];
			const key = Math.min(a, b) * vertexCount + Math.max(a, b);
			const first = crowded.get(key);
			if (first === undefined) crowded.set(key, t);
			else join(first, t);
		}
	}
	const of = new Uint32Array(faces);
	const number = new Int32Array(faces).fill(-1);
	let count = 0;
	for (let t = 0; t < faces; t++) {
		const r = root(t);
		if (number[r] < 0) number[r] = count++;
		of[t] = number[r];
	}
	return { of, count };
}

/**
 * Closed chains of open edges. A chain that meets itself at a vertex is split there, so that holes that touch in a point
 * are counted one by one; `chains` are those that do not close (where orientations clash).
 */
export function countLoops(triangles: Uint32Array, edges: EdgeTable): { loops: number; chains: number } {
	const next = new Map<number, number[]>();
	for (let e = 0; e < triangles.length; e++) {
		if (!edges.open[e]) continue;
		const a = triangles[e];
		const list = next.get(a);
		if (list) list.push(e);
		else next.set(a, [e]);
	}
	let loops = 0;
	let chains = 0;
	for (const [begin, list] of next) {
		while (list.length > 0) {
			const path = [begin];
			const onPath = new Set(path);
			for (;;) {
				const edge = next.get(path[path.length - 1])?.pop();
				if (edge === undefined) break;
				const to = triangles[edge % 3 === 2 ? edge - 2 : edge + 1];
				if (!onPath.has(to)) {
					path.push(to);
					onPath.add(to);
					continue;
				}
				loops++;
				while (path[path.length - 1] !== to) onPath.delete(path.pop()!);
			}
			if (path.length > 1) chains++;
		}
	}
	return { loops, chains };
}
