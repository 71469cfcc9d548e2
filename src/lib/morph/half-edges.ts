/** How a triangle mesh's triangles meet at their edges. */
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
