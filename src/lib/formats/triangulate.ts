import { MorphError } from '$lib/morph';

/** Sum of the squares of the corner counts that ear clipping is given before the file is refused: some seconds. */
const EAR_WORK = 2e9;
const MIN_RELATIVE_AREA = 1e-14;

/** Twice the signed area of (a, b, c) in the plane. */
const cross = (p: Float64Array, a: number, b: number, c: number) =>
	(p[2 * b] - p[2 * a]) * (p[2 * c + 1] - p[2 * a + 1]) - (p[2 * b + 1] - p[2 * a + 1]) * (p[2 * c] - p[2 * a]);

/**
 * Splits polygons of any shape: a fan where it covers the polygon without overlap (all convex ones), else ear clipping
 * (Meisters 1975) in the plane of Newell's normal. Every corner is kept, so that neighbours along an edge still meet.
 */
export class Triangulator {
	private plane = new Float64Array(16);
	private next = new Int32Array(8);
	private previous = new Int32Array(8);
	private work = 0;
	/** Polygons that were not convex. */
	clipped = 0;
	/** Polygons that cross themselves or have no area, split without a guarantee. */
	odd = 0;

	/** @param positions N x 3, borrowed */
	constructor(private readonly positions: Float32Array) {}

	/**
	 * @param corners the polygon's corners are corners[from] .. corners[to - 1], at least 3
	 * @param out receives 3 indices for each of the to - from - 2 triangles
	 */
	split(corners: Uint32Array, from: number, to: number, out: Uint32Array, at: number, polygon: number): void {
		const n = to - from;
		if (n === 3) {
			out[at] = corners[from];
			out[at + 1] = corners[from + 1];
			out[at + 2] = corners[from + 2];
			return;
		}
		this.project(corners, from, n);
		if (this.fanFits(n)) {
			for (let k = 1; k < n - 1; k++) {
				out[at++] = corners[from];
				out[at++] = corners[from + k];
				out[at++] = corners[from + k + 1];
			}
			return;
		}
		this.work += n * n;
		if (this.work > EAR_WORK) {
			throw new MorphError(
				'file-too-large',
				`Polygon ${polygon} has ${n} corners and is not convex: the polygons of this file are too large to be split.`,
				'Triangulate the surface where it was made, then export again.',
				{ byte: 0 }
			);
		}
		this.clip(corners, from, n, out, at);
	}

	private project(corners: Uint32Array, from: number, n: number): void {
		const p = this.positions;
		if (this.plane.length < 2 * n) {
			this.plane = new Float64Array(4 * n);
			this.next = new Int32Array(2 * n);
			this.previous = new Int32Array(2 * n);
		}
		let nx = 0;
		let ny = 0;
		let nz = 0;
		const o = 3 * corners[from];
		for (let k = 0; k < n; k++) {
			const a = 3 * corners[from + k];
			const b = 3 * corners[from + (k + 1 === n ? 0 : k + 1)];
			// About the first corner, so that a place far from the origin loses no digits.
			const ax = p[a] - p[o];
			const ay = p[a + 1] - p[o + 1];
			const az = p[a + 2] - p[o + 2];
			const bx = p[b] - p[o];
			const by = p[b + 1] - p[o + 1];
			const bz = p[b + 2] - p[o + 2];
			nx += ay * bz - az * by;
			ny += az * bx - ax * bz;
			nz += ax * by - ay * bx;
		}
		const [x, y, z] = [Math.abs(nx), Math.abs(ny), Math.abs(nz)];
		const drop = x >= y && x >= z ? 0 : y >= z ? 1 : 2;
		const flip = (drop === 0 ? nx : drop === 1 ? ny : nz) < 0;
		let u = (drop + 1) % 3;
		let v = (drop + 2) % 3;
		if (flip) [u, v] = [v, u];
		for (let k = 0; k < n; k++) {
			const a = 3 * corners[from + k];
			this.plane[2 * k] = p[a + u] - p[o + u];
			this.plane[2 * k + 1] = p[a + v] - p[o + v];
		}
	}

	private fanFits(n: number): boolean {
		const p = this.plane;
		let area = 0;
		let least = Infinity;
		for (let k = 1; k < n - 1; k++) {
			const a = cross(p, 0, k, k + 1);
			area += a;
			if (a < least) least = a;
		}
		return least > MIN_RELATIVE_AREA * area;
	}

	private isEar(b: number): boolean {
		const p = this.plane;
		const { next, previous } = this;
		const a = previous[b];
		const c = next[b];
		const [ax, ay, bx, by, cx, cy] = [p[2 * a], p[2 * a + 1], p[2 * b], p[2 * b + 1], p[2 * c], p[2 * c + 1]];
		for (let q = next[c]; q !== a; q = next[q]) {
			const x = p[2 * q];
			const y = p[2 * q + 1];
			if ((x === ax && y === ay) || (x === bx && y === by) || (x === cx && y === cy)) continue;
			if (cross(p, a, b, q) >= 0 && cross(p, b, c, q) >= 0 && cross(p, c, a, q) >= 0) return false;
		}
		return true;
	}

	private clip(corners: Uint32Array, from: number, n: number, out: Uint32Array, at: number): void {
		const { next, previous, plane } = this;
		for (let k = 0; k < n; k++) {
			next[k] = k + 1 === n ? 0 : k + 1;
			previous[k] = k === 0 ? n - 1 : k - 1;
		}
		let left = n;
		let b = 0;
		let tried = 0;
		let forced = false;
		while (left > 3) {
			const a = previous[b];
			const c = next[b];
			// After a round without a proper ear: corners on a straight line, then anything.
			const turn = cross(plane, a, b, c);
			const ear = tried < left ? turn > 0 && this.isEar(b) : tried < 2 * left ? turn === 0 : true;
			if (!ear) {
				b = c;
				tried++;
				continue;
			}
			if (tried >= 2 * left) forced = true;
			out[at++] = corners[from + a];
			out[at++] = corners[from + b];
			out[at++] = corners[from + c];
			next[a] = c;
			previous[c] = a;
			left--;
			tried = 0;
			b = next[c];
		}
		out[at++] = corners[from + previous[b]];
		out[at++] = corners[from + b];
		out[at] = corners[from + next[b]];
		this.clipped++;
		if (forced) this.odd++;
	}
}
