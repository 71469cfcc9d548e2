/** Nearest of many points within a fixed small radius, by a hash of cells of twice the radius. */
export class PointGrid {
	private readonly cell: number;
	private readonly mask: number;
	private readonly start: Uint32Array;
	private readonly order: Uint32Array;
	/** Distance of the point that `nearest` last returned. */
	distance = 0;

	/** @param points n x 3, borrowed and kept */
	constructor(
		private readonly points: Float64Array,
		private readonly radius: number
	) {
		const n = points.length / 3;
		this.cell = radius > 0 ? 2 * radius : 1;
		let size = 16;
		while (size < 2 * n) size *= 2;
		this.mask = size - 1;
		this.start = new Uint32Array(size + 1);
		const slots = new Uint32Array(n);
		for (let i = 0; i < n; i++) {
			slots[i] = this.slot(this.at(points[3 * i]), this.at(points[3 * i + 1]), this.at(points[3 * i + 2]));
			this.start[slots[i] + 1]++;
		}
		for (let s = 0; s < size; s++) this.start[s + 1] += this.start[s];
		const fill = this.start.slice(0, size);
		this.order = new Uint32Array(n);
		for (let i = 0; i < n; i++) this.order[fill[slots[i]]++] = i;
	}

	private at(x: number): number {
		return Math.floor(x / this.cell);
	}

	private slot(i: number, j: number, k: number): number {
		let h = Math.imul(i | 0, 73856093) ^ Math.imul(j | 0, 19349663) ^ Math.imul(k | 0, 83492791);
		h ^= h >>> 16;
		h = Math.imul(h, 0x45d9f3b);
		return (h ^ (h >>> 15)) & this.mask;
	}

	/**
	 * Index of the nearest point within the radius (the lowest of equally near ones), or -1.
	 * @param guess index that is looked at first: files are often in the mesh's own order
	 */
	nearest(x: number, y: number, z: number, guess: number): number {
		const { points, radius } = this;
		if (3 * guess < points.length) {
			const exact = points[3 * guess] === x && points[3 * guess + 1] === y && points[3 * guess + 2] === z;
			if (exact) {
				this.distance = 0;
				return guess;
			}
		}
		let best = -1;
		let bestSquare = radius * radius;
		const [i1, j1, k1] = [this.at(x + radius), this.at(y + radius), this.at(z + radius)];
		for (let i = this.at(x - radius); i <= i1; i++) {
			for (let j = this.at(y - radius); j <= j1; j++) {
				for (let k = this.at(z - radius); k <= k1; k++) {
					const s = this.slot(i, j, k);
					for (let o = this.start[s]; o < this.start[s + 1]; o++) {
						const p = this.order[o];
						const square = (points[3 * p] - x) ** 2 + (points[3 * p + 1] - y) ** 2 + (points[3 * p + 2] - z) ** 2;
						if (square < bestSquare || (square === bestSquare && (best < 0 || p < best))) {
							bestSquare = square;
							best = p;
						}
					}
				}
			}
		}
		this.distance = Math.sqrt(bestSquare);
		return best;
	}
}
