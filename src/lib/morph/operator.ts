import { boxBases, evaluateBasis, type Basis } from './basis';
import { boxAxes, embed, freePoints } from './box';
import { cellMoments, cellValues, chooseCells, gridExpansions, makeCellGrid, type CellGrid } from './cells';
import { metricFromMoments, productTables, UU, UV, UW, VV, VW, WW } from './metric';
import type { Checkpoint, DesignBox, Surface } from './types';

/** Rough costs in multiply-adds, measured once; they only choose between two paths with equal results. */
const CELL_COST_PER_VERTEX = 2500;
const CELL_COST_FIXED = 2e7;

/**
 * One box's lattice as a linear map between control points and vertices: dx = W B q. Knows nothing of axes or
 * constraints.
 */
export class BoxOperator {
	readonly inside: Uint32Array;
	readonly path: 'direct' | 'moments';
	/** Held points are left out: row of each control point in the metric, -1 when held. */
	readonly freeIndex: Int32Array;
	readonly free: Uint32Array;
	readonly pointCount: number;
	readonly axes: Float64Array;
	private readonly bases: [Basis, Basis, Basis];
	private readonly uvw: Float64Array;
	private readonly weights: Float64Array | null;
	private readonly grid: CellGrid | null;

	constructor(
		readonly box: DesignBox,
		surface: Pick<Surface, 'positions'>,
		weights: Float64Array | undefined,
		path: 'auto' | 'direct' | 'moments'
	) {
		const { inside, uvw } = embed(surface.positions, box);
		this.inside = inside;
		this.uvw = uvw;
		this.bases = boxBases(box);
		this.axes = boxAxes(box);
		this.free = freePoints(box);
		this.pointCount = box.lattice[0] * box.lattice[1] * box.lattice[2];
		this.freeIndex = new Int32Array(this.pointCount).fill(-1);
		this.free.forEach((p, i) => (this.freeIndex[p] = i));
		this.weights = weights ? Float64Array.from(inside, (v) => weights[v]) : null;
		let chosen: ReturnType<typeof chooseCells> = null;
		if (box.basis === 'bernstein' && path !== 'direct') {
			const direct = inside.length * this.free.length * this.free.length * 1.5;
			if (path === 'moments' || direct > inside.length * CELL_COST_PER_VERTEX + CELL_COST_FIXED) {
				chosen = chooseCells([box.lattice[0] - 1, box.lattice[1] - 1, box.lattice[2] - 1], inside.length);
			}
		}
		this.grid = chosen ? makeCellGrid(uvw, chosen.cells, chosen.order) : null;
		this.path = this.grid ? 'moments' : 'direct';
	}

	private degrees(factor: number): [number, number, number] {
		const [nu, nv, nw] = this.box.lattice;
		return [factor * (nu - 1), factor * (nv - 1), factor * (nw - 1)];
	}

	/**
	 * B' W f for a vector field on the surface.
	 * @param field N x 3, borrowed
	 * @returns nPoints x 3
	 */
	project(field: Float64Array): Float64Array {
		const { inside, weights } = this;
		const n = inside.length;
		const local = new Float64Array(3 * n);
		for (let i = 0; i < n; i++) {
			const w = weights ? weights[i] : 1;
			const v = 3 * inside[i];
			local[3 * i] = w * field[v];
			local[3 * i + 1] = w * field[v + 1];
			local[3 * i + 2] = w * field[v + 2];
		}
		if (this.grid) {
			return cellMoments(this.grid, local, 3, gridExpansions(this.grid, this.degrees(1)));
		}
		const out = new Float64Array(3 * this.pointCount);
		this.eachVertex((i, u, v, w) => {
			const x = local[3 * i];
			const y = local[3 * i + 1];
			const z = local[3 * i + 2];
			this.eachPoint(u, v, w, (p, value) => {
				out[3 * p] += value * x;
				out[3 * p + 1] += value * y;
				out[3 * p + 2] += value * z;
			});
		});
		return out;
	}

	/**
	 * W B q.
	 * @param lattice nPoints x 3, borrowed
	 * @returns inside.length x 3
	 */
	evaluate(lattice: Float64Array): Float64Array {
		let out: Float64Array;
		if (this.grid) {
			out = cellValues(this.grid, lattice, gridExpansions(this.grid, this.degrees(1)));
		} else {
			out = new Float64Array(3 * this.inside.length);
			this.eachVertex((i, u, v, w) => {
				let x = 0;
				let y = 0;
				let z = 0;
				this.eachPoint(u, v, w, (p, value) => {
					x += value * lattice[3 * p];
					y += value * lattice[3 * p + 1];
					z += value * lattice[3 * p + 2];
				});
				out[3 * i] = x;
				out[3 * i + 1] = y;
				out[3 * i + 2] = z;
			});
		}
		if (this.weights) for (let i = 0; i < out.length; i++) out[i] *= this.weights[Math.floor(i / 3)];
		return out;
	}

	/**
	 * Adds B' W f for a field that is `vector` at one vertex and zero elsewhere; nothing when the vertex lies outside.
	 * @param lattice nPoints x 3, added to
	 */
	projectVertex(vertex: number, x: number, y: number, z: number, lattice: Float64Array): void {
		const i = indexOf(this.inside, vertex);
		if (i < 0) return;
		const factor = this.weights ? this.weights[i] : 1;
		const [u, v, w] = this.bases.map((basis, d) => {
			const values = new Float64Array(basis.count);
			evaluateBasis(basis, this.uvw[3 * i + d], values, new Float64Array(basis.count));
			return values;
		});
		this.eachPoint(u, v, w, (p, value) => {
			lattice[3 * p] += factor * value * x;
			lattice[3 * p + 1] += factor * value * y;
			lattice[3 * p + 2] += factor * value * z;
		});
	}

	/** Values (and slopes) of the three bases at each vertex inside. */
	private eachVertex(
		visit: (i: number, u: Float64Array, v: Float64Array, w: Float64Array, slopes: Float64Array[]) => void
	) {
		const [bu, bv, bw] = this.bases;
		const u = new Float64Array(bu.count);
		const v = new Float64Array(bv.count);
		const w = new Float64Array(bw.count);
		const slopes = [new Float64Array(bu.count), new Float64Array(bv.count), new Float64Array(bw.count)];
		for (let i = 0; i < this.inside.length; i++) {
			evaluateBasis(bu, this.uvw[3 * i], u, slopes[0]);
			evaluateBasis(bv, this.uvw[3 * i + 1], v, slopes[1]);
			evaluateBasis(bw, this.uvw[3 * i + 2], w, slopes[2]);
			visit(i, u, v, w, slopes);
		}
	}

	private eachPoint(u: Float64Array, v: Float64Array, w: Float64Array, visit: (p: number, value: number) => void) {
		for (let i = 0, p = 0; i < u.length; i++) {
			if (u[i] === 0) {
				p += v.length * w.length;
				continue;
			}
			for (let j = 0; j < v.length; j++) {
				const f = u[i] * v[j];
				if (f === 0) {
					p += w.length;
					continue;
				}
				for (let k = 0; k < w.length; k++, p++) if (w[k] !== 0) visit(p, f * w[k]);
			}
		}
	}

	/** M + r^2 K on the free points, free x free. */
	metric(surface: Surface, smoothing: number, checkpoint?: Checkpoint): Float64Array {
		return this.grid
			? this.momentMetric(surface, smoothing, checkpoint)
			: this.directMetric(surface, smoothing, checkpoint);
	}

	private momentMetric(surface: Surface, smoothing: number, checkpoint?: Checkpoint): Float64Array {
		const { inside, axes, weights } = this;
		const n = inside.length;
		const sets = new Float64Array(6 * n);
		const [a0, a1, a2, b0, b1, b2, c0, c1, c2] = axes;
		for (let i = 0; i < n; i++) {
			const id = inside[i];
			const w = weights ? weights[i] : 1;
			const m = surface.mass[id] * w * w;
			const x = surface.normals[3 * id];
			const y = surface.normals[3 * id + 1];
			const z = surface.normals[3 * id + 2];
			const nu = x * a0 + y * a1 + z * a2;
			const nv = x * b0 + y * b1 + z * b2;
			const nw = x * c0 + y * c1 + z * c2;
			// A vertex without area has mass 0, so its missing normal does not matter; the trace is 2 m elsewhere.
			sets[6 * i + UU] = m * (nv * nv + nw * nw);
			sets[6 * i + VV] = m * (nu * nu + nw * nw);
			sets[6 * i + WW] = m * (nu * nu + nv * nv);
			sets[6 * i + UV] = -m * nu * nv;
			sets[6 * i + UW] = -m * nu * nw;
			sets[6 * i + VW] = -m * nv * nw;
		}
		const grid = this.grid as CellGrid;
		const moments = cellMoments(grid, sets, 6, gridExpansions(grid, this.degrees(2)), checkpoint);
		const tables = this.box.lattice.map((count, d) => productTables(count - 1, 1 / (2 * this.box.halfSize[d])));
		return metricFromMoments(
			moments,
			tables as [ReturnType<typeof productTables>, ReturnType<typeof productTables>, ReturnType<typeof productTables>],
			smoothing,
			this.freeIndex,
			this.free.length
		);
	}

	private directMetric(surface: Surface, smoothing: number, checkpoint?: Checkpoint): Float64Array {
		const size = this.free.length;
		const out = new Float64Array(size * size);
		const every = Math.max(1, Math.floor(2e7 / (size * size)));
		this.eachRow(surface, smoothing, null, (i, rows, index, used) => {
			for (let a = 0; a < used; a++) {
				const p = rows[0][a];
				const q = rows[1][a];
				const s = rows[2][a];
				const line = index[a] * size;
				// Free points come in ascending order, so b <= a fills the lower triangle.
				if (smoothing > 0) {
					for (let b = 0; b <= a; b++) out[line + index[b]] += p * rows[0][b] + q * rows[1][b] + s * rows[2][b];
				} else for (let b = 0; b <= a; b++) out[line + index[b]] += p * rows[0][b];
			}
			if (i % every === 0) checkpoint?.(i / this.inside.length);
		});
		for (let a = 0; a < size; a++) for (let b = 0; b < a; b++) out[b * size + a] = out[a * size + b];
		return out;
	}

	/**
	 * The metric between this box's free points and another's, over the vertices in both.
	 * @param both vertex ids in both boxes, ascending
	 * @returns this.free x other.free
	 */
	crossMetric(other: BoxOperator, both: Uint32Array, surface: Surface, smoothing: number): Float64Array {
		const size = other.free.length;
		const out = new Float64Array(this.free.length * size);
		// The other box's rows are kept for a batch of vertices at a time, to bound the memory.
		const batch = 512;
		for (let first = 0; first < both.length; first += batch) {
			const ids = both.subarray(first, Math.min(both.length, first + batch));
			const kept: { rows: Float64Array[]; index: Int32Array }[] = [];
			other.eachRow(surface, smoothing, ids, (_, rows, index, used) => {
				kept.push({ rows: rows.map((r) => r.slice(0, used)), index: index.slice(0, used) });
			});
			let at = 0;
			this.eachRow(surface, smoothing, ids, (_, rows, index, used) => {
				const right = kept[at++];
				for (let a = 0; a < used; a++) {
					const line = index[a] * size;
					for (let b = 0; b < right.index.length; b++) {
						out[line + right.index[b]] +=
							rows[0][a] * right.rows[0][b] + rows[1][a] * right.rows[1][b] + rows[2][a] * right.rows[2][b];
					}
				}
			});
		}
		return out;
	}

	/**
	 * For each vertex: sqrt(m) W B and r sqrt(m) W times the slopes of B along two tangents, on the free points with
	 * nonzero basis. (I - n n' = t1 t1' + t2 t2'.)
	 */
	private eachRow(
		surface: Surface,
		smoothing: number,
		only: Uint32Array | null,
		visit: (i: number, rows: [Float64Array, Float64Array, Float64Array], index: Int32Array, used: number) => void
	): void {
		const rows: [Float64Array, Float64Array, Float64Array] = [
			new Float64Array(this.free.length),
			new Float64Array(this.free.length),
			new Float64Array(this.free.length)
		];
		const index = new Int32Array(this.free.length);
		const [nu, nv, nw] = this.box.lattice;
		const { axes } = this;
		const scale = this.box.halfSize.map((h) => 1 / (2 * h));
		const [bu, bv, bw] = this.bases;
		const u = new Float64Array(nu);
		const v = new Float64Array(nv);
		const w = new Float64Array(nw);
		const su = new Float64Array(nu);
		const sv = new Float64Array(nv);
		const sw = new Float64Array(nw);
		const t = new Float64Array(6);
		let cursor = 0;
		for (let at = 0; at < (only ? only.length : this.inside.length); at++) {
			let i = at;
			if (only) {
				while (this.inside[cursor] < only[at]) cursor++;
				i = cursor;
			}
			const id = this.inside[i];
			const root = Math.sqrt(surface.mass[id]) * (this.weights ? this.weights[i] : 1);
			evaluateBasis(bu, this.uvw[3 * i], u, su);
			evaluateBasis(bv, this.uvw[3 * i + 1], v, sv);
			evaluateBasis(bw, this.uvw[3 * i + 2], w, sw);
			tangents(surface.normals, id, t);
			// Tangents in the box's axes, in units of the slopes.
			const r = smoothing * root;
			const f = [0, 1].map((k) =>
				[0, 1, 2].map(
					(d) =>
						r * scale[d] * (t[3 * k] * axes[3 * d] + t[3 * k + 1] * axes[3 * d + 1] + t[3 * k + 2] * axes[3 * d + 2])
				)
			);
			const [f0, f1, f2] = f[0];
			const [g0, g1, g2] = f[1];
			let used = 0;
			for (let a = 0; a < nu; a++) {
				if (u[a] === 0 && su[a] === 0) continue;
				for (let b = 0; b < nv; b++) {
					if (v[b] === 0 && sv[b] === 0) continue;
					const uv = u[a] * v[b];
					const s0 = su[a] * v[b];
					const s1 = u[a] * sv[b];
					const left = f0 * s0 + f1 * s1;
					const right = g0 * s0 + g1 * s1;
					for (let c = 0; c < nw; c++) {
						const row = this.freeIndex[(a * nv + b) * nw + c];
						if (row < 0) continue;
						rows[0][used] = root * uv * w[c];
						rows[1][used] = left * w[c] + f2 * uv * sw[c];
						rows[2][used] = right * w[c] + g2 * uv * sw[c];
						index[used] = row;
						used++;
					}
				}
			}
			visit(i, rows, index, used);
		}
	}
}

/** Where a value stands in an ascending list; -1 when it is not there. */
export function indexOf(list: Uint32Array, value: number): number {
	let low = 0;
	let high = list.length - 1;
	while (low <= high) {
		const middle = (low + high) >> 1;
		if (list[middle] === value) return middle;
		if (list[middle] < value) low = middle + 1;
		else high = middle - 1;
	}
	return -1;
}

/** Two unit vectors that complete the vertex's normal to a frame (Duff et al. 2017), 6 numbers; any frame without one. */
function tangents(normals: Float64Array, v: number, out: Float64Array): void {
	const x = normals[3 * v];
	const y = normals[3 * v + 1];
	const z = normals[3 * v + 2];
	const sign = z >= 0 ? 1 : -1;
	const a = -1 / (sign + z);
	const b = x * y * a;
	out[0] = 1 + sign * x * x * a;
	out[1] = sign * b;
	out[2] = -sign * x;
	out[3] = b;
	out[4] = sign + y * y * a;
	out[5] = -y;
}
