/** Number of float32 words of one corner. */
const CORNER = 3;
/** Multipliers of the spatial hash of Teschner et al. 2003 (optimised spatial hashing), applied to the bits. */
const HASH_X = 73856093;
const HASH_Y = 19349663;
const HASH_Z = 83492791;
const MINUS_ZERO_BITS = 0x80000000;

function hashBits(x: number, y: number, z: number): number {
	let h = Math.imul(x, HASH_X) ^ Math.imul(y, HASH_Y) ^ Math.imul(z, HASH_Z);
	// The low bits of round coordinates are all zero, so the high ones are folded down twice.
	h ^= h >>> 16;
	h = Math.imul(h, 0x45d9f3b);
	h ^= h >>> 15;
	return h;
}

/**
 * Exact welding of corners with equal float32 coordinates. Open addressing with linear probing; the table doubles when
 * it is two thirds full. Feed corners in file order: vertices are numbered by first appearance.
 */
export class Welder {
	/** Bits of the vertices found so far, 3 words each. */
	private bits: Uint32Array;
	private table: Int32Array;
	private mask: number;
	private limit: number;
	count = 0;

	constructor(expectedVertices: number) {
		let size = 1024;
		while (size * 0.6 < expectedVertices) size *= 2;
		this.table = new Int32Array(size).fill(-1);
		this.mask = size - 1;
		this.limit = Math.floor(size * 0.66);
		this.bits = new Uint32Array(CORNER * (this.limit + 1));
	}

	private grow(): void {
		const size = this.table.length * 2;
		const table = new Int32Array(size).fill(-1);
		const mask = size - 1;
		const old = this.bits;
		for (let v = 0; v < this.count; v++) {
			let slot = hashBits(old[CORNER * v], old[CORNER * v + 1], old[CORNER * v + 2]) & mask;
			while (table[slot] >= 0) slot = (slot + 1) & mask;
			table[slot] = v;
		}
		this.table = table;
		this.mask = mask;
		this.limit = Math.floor(size * 0.66);
		this.bits = new Uint32Array(CORNER * (this.limit + 1));
		this.bits.set(old.subarray(0, CORNER * this.count));
	}

	/** Index of the vertex with these float32 bits; -0 counts as +0. */
	add(x: number, y: number, z: number): number {
		if (x === MINUS_ZERO_BITS) x = 0;
		if (y === MINUS_ZERO_BITS) y = 0;
		if (z === MINUS_ZERO_BITS) z = 0;
		const { table, bits, mask } = this;
		let slot = hashBits(x, y, z) & mask;
		for (;;) {
			const v = table[slot];
			if (v < 0) break;
			const at = CORNER * v;
			if (bits[at] === x && bits[at + 1] === y && bits[at + 2] === z) return v;
			slot = (slot + 1) & mask;
		}
		const v = this.count++;
		table[slot] = v;
		bits[CORNER * v] = x;
		bits[CORNER * v + 1] = y;
		bits[CORNER * v + 2] = z;
		if (this.count >= this.limit) this.grow();
		return v;
	}

	/** A copy of the vertices, N x 3. */
	positions(): Float32Array {
		return new Float32Array(this.bits.slice(0, CORNER * this.count).buffer);
	}
}

/**
 * Welds a triangle soup.
 * @param corners 9 float32 per triangle, borrowed
 * @returns positions N x 3 (numbered by first appearance) and triangles F x 3, in the order given
 */
export function weldTriangles(corners: Float32Array): { positions: Float32Array; triangles: Uint32Array } {
	const bits = new Uint32Array(corners.buffer, corners.byteOffset, corners.length);
	const n = bits.length / CORNER;
	const triangles = new Uint32Array(n);
	const welder = new Welder(n / 5);
	for (let i = 0; i < n; i++) triangles[i] = welder.add(bits[CORNER * i], bits[CORNER * i + 1], bits[CORNER * i + 2]);
	return { positions: welder.positions(), triangles };
}
