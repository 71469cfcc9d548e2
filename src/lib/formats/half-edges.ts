/** What surfaceHealth and the repairs need to know of a triangle mesh's edges. */
export interface EdgeTable {
	/**
	 * For each directed edge 3 t + k (from corner k to corner k + 1 of triangle t): the directed edge on the other side where
	 * exactly two triangles meet, else -1.
	 */
	opposite: Int32Array;
	/** 1 for directed edges that no other triangle shares. */
	open: Uint8Array;
	/** 1 for directed edges whose edge belongs to more than two triangles. */
	crowded: Uint8Array;
	/** 1 for directed edges whose one neighbour runs the same way: the two triangles are oriented against each other. */
	against: Uint8Array;
	/** Edges (not directed). */
	openCount: number;
	crowdedCount: number;
	againstCount: number;
}

/**
 * Matches edges by their vertices: directed edges are sorted into lists by their lower vertex (counting sort), and the
 * short lists compared. Edges from a vertex to itself are left out.
 * @param triangles F x 3, borrowed
 */
export function edgeTable(triangles: Uint32Array, vertexCount: number): EdgeTable {
	const n = triangles.length;
	const start = new Uint32Array(vertexCount + 1);
	const other = (e: number) => triangles[e % 3 === 2 ? e - 2 : e + 1];
	for (let e = 0; e < n; e++) {
		const a = triangles[e];
		const b = other(e);
		if (a !== b) start[(a < b ? a : b) + 1]++;
	}
	for (let v = 0; v < vertexCount; v++) start[v + 1] += start[v];
	const fill = start.slice(0, vertexCount);
	const list = new Uint32Array(start[vertexCount]);
	for (let e = 0; e < n; e++) {
		const a = triangles[e];
		const b = other(e);
		if (a !== b) list[fill[a < b ? a : b]++] = e;
	}
	const table: EdgeTable = {
		opposite: new Int32Array(n).fill(-1),
		open: new Uint8Array(n),
		crowded: new Uint8Array(n),
		against: new Uint8Array(n),
		openCount: 0,
		crowdedCount: 0,
		againstCount: 0
	};
	const upper = (e: number) => {
		const a = triangles[e];
		const b = other(e);
		return a > b ? a : b;
	};
	for (let v = 0; v < vertexCount; v++) {
		const from = start[v];
		const to = start[v + 1];
		if (to === from) continue;
		sortBy(list, from, to, upper);
		for (let i = from; i < to;) {
			let j = i + 1;
			const end = upper(list[i]);
			while (j < to && upper(list[j]) === end) j++;
			closeGroup(table, list, i, j, triangles);
			i = j;
		}
	}
	return table;
}

/** Insertion sort for the usual short list; a hub (the tip of a fan) goes to the library. Equal keys keep their order. */
function sortBy(list: Uint32Array, from: number, to: number, key: (e: number) => number): void {
	if (to - from > 64) {
		list.subarray(from, to).sort((a, b) => key(a) - key(b) || a - b);
		return;
	}
	for (let i = from + 1; i < to; i++) {
		const e = list[i];
		const k = key(e);
		let j = i - 1;
		while (j >= from && key(list[j]) > k) {
			list[j + 1] = list[j];
			j--;
		}
		list[j + 1] = e;
	}
}

function closeGroup(table: EdgeTable, list: Uint32Array, from: number, to: number, triangles: Uint32Array): void {
	if (to - from === 1) {
		table.open[list[from]] = 1;
		table.openCount++;
	} else if (to - from > 2) {
		for (let i = from; i < to; i++) table.crowded[list[i]] = 1;
		table.crowdedCount++;
	} else {
		const a = list[from];
		const b = list[from + 1];
		table.opposite[a] = b;
		table.opposite[b] = a;
		if (triangles[a] === triangles[b]) {
			table.against[a] = 1;
			table.against[b] = 1;
			table.againstCount++;
		}
	}
}

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
