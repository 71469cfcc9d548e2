import { expandBernstein, truncationBound, type CellExpansion } from './chebyshev';
import type { Checkpoint } from './types';

/**
 * Sums over vertices against products of Bernstein polynomials, and the polynomials' values at the vertices, by small
 * cells of the box. Inside a cell a product is a few Chebyshev terms of total order at most `order`; the vertices of a
 * cell meet only those, and each cell is spread to (or fed from) the global polynomials once, axis by axis: cells to
 * columns, columns to slabs, slabs to the whole. The truncation is bounded before it is used (truncationBound).
 */
export interface CellGrid {
	/** Cells along u, v, w. */
	cells: [number, number, number];
	order: number;
	/** Terms per cell: (order + 1)(order + 2)(order + 3) / 6. */
	terms: number;
	/** Vertices sorted by cell; within a cell ascending. */
	sorted: Uint32Array;
	/** n x 3 local coordinates in [-1, 1], in sorted order. */
	local: Float64Array;
	/** First vertex of each occupied cell in `sorted`, and one past the last. */
	starts: Uint32Array;
	/** Cell number (cu * cells_v + cv) * cells_w + cw of each occupied cell, ascending. */
	keys: Uint32Array;
}

const CELL_STEPS = [1, 2, 4, 8, 12, 16, 24, 32, 48, 64, 96, 128];
const ORDERS = [5, 7, 9];
/** Bound of the truncation, relative to polynomials of largest value 1: for the metric, and for moves and gradients. */
export const METRIC_TOLERANCE = 1e-9;
export const FIELD_TOLERANCE = 1e-11;

/**
 * Smallest cell grid that meets the tolerances for lattice degrees (by axis) and the metric's doubled degrees, or null
 * when none does.
 */
export function chooseCells(
	degrees: readonly [number, number, number]
): { cells: [number, number, number]; order: number } | null {
	for (const order of ORDERS) {
		for (const step of CELL_STEPS) {
			const top = Math.max(...degrees);
			// Finer along the axis of higher degree.
			const cells = degrees.map((d) => Math.max(1, Math.ceil((step * d) / top))) as [number, number, number];
			const single = degrees.map((d, k) => expandBernstein(d, cells[k], 0).magnitudes);
			if (truncationBound(single[0], single[1], single[2], order) > FIELD_TOLERANCE) continue;
			const double = degrees.map((d, k) => expandBernstein(2 * d, cells[k], 0).magnitudes);
			if (truncationBound(double[0], double[1], double[2], order) > METRIC_TOLERANCE) continue;
			return { cells, order };
		}
	}
	return null;
}

/** Sorts vertices into cells. uvw is n x 3 in [0, 1], borrowed. */
export function makeCellGrid(uvw: Float64Array, cells: [number, number, number], order: number): CellGrid {
	const n = uvw.length / 3;
	const [cu, cv, cw] = cells;
	const key = new Uint32Array(n);
	const counts = new Uint32Array(cu * cv * cw + 1);
	for (let i = 0; i < n; i++) {
		const a = Math.min(cu - 1, Math.floor(uvw[3 * i] * cu));
		const b = Math.min(cv - 1, Math.floor(uvw[3 * i + 1] * cv));
		const c = Math.min(cw - 1, Math.floor(uvw[3 * i + 2] * cw));
		key[i] = (a * cv + b) * cw + c;
		counts[key[i] + 1]++;
	}
	let occupied = 0;
	for (let k = 0; k < counts.length - 1; k++) if (counts[k + 1] > 0) occupied++;
	const starts = new Uint32Array(occupied + 1);
	const keys = new Uint32Array(occupied);
	let o = 0;
	for (let k = 0; k < counts.length - 1; k++) {
		const here = counts[k + 1];
		counts[k + 1] += counts[k];
		if (here > 0) {
			keys[o] = k;
			starts[o] = counts[k];
			o++;
		}
	}
	starts[occupied] = n;
	const sorted = new Uint32Array(n);
	const local = new Float64Array(3 * n);
	for (let i = 0; i < n; i++) {
		const at = counts[key[i]]++;
		sorted[at] = i;
		const c = key[i] % cw;
		const rest = (key[i] - c) / cw;
		const b = rest % cv;
		const a = (rest - b) / cv;
		local[3 * at] = 2 * (uvw[3 * i] * cu - a) - 1;
		local[3 * at + 1] = 2 * (uvw[3 * i + 1] * cv - b) - 1;
		local[3 * at + 2] = 2 * (uvw[3 * i + 2] * cw - c) - 1;
	}
	return { cells, order, terms: ((order + 1) * (order + 2) * (order + 3)) / 6, sorted, local, starts, keys };
}

/** Expansions of the polynomials of these degrees (by axis) on a grid's cells. */
export function gridExpansions(
	grid: CellGrid,
	degrees: readonly [number, number, number]
): [CellExpansion, CellExpansion, CellExpansion] {
	const of = (axis: number) => expandBernstein(degrees[axis], grid.cells[axis], grid.order);
	return [of(0), of(1), of(2)];
}

/** Values of the kept products T_a(x) T_b(y) T_c(z), c fastest, at one vertex. */
function chebyshevProducts(
	order: number,
	x: number,
	y: number,
	z: number,
	tx: Float64Array,
	ty: Float64Array,
	tz: Float64Array,
	out: Float64Array
): void {
	tx[0] = ty[0] = tz[0] = 1;
	tx[1] = x;
	ty[1] = y;
	tz[1] = z;
	for (let k = 2; k <= order; k++) {
		tx[k] = 2 * x * tx[k - 1] - tx[k - 2];
		ty[k] = 2 * y * ty[k - 1] - ty[k - 2];
		tz[k] = 2 * z * tz[k - 1] - tz[k - 2];
	}
	let l = 0;
	for (let a = 0; a <= order; a++) {
		const fa = tx[a];
		for (let b = 0; b <= order - a; b++) {
			const fab = fa * ty[b];
			for (let c = 0; c <= order - a - b; c++) out[l++] = fab * tz[c];
		}
	}
}

/**
 * Moments: for each of `sets` weights per vertex, sum over vertices of weight * A_i(u) B_j(v) C_k(w).
 * @param weights n x sets, in the vertices' own order, borrowed; sets a multiple of 3
 * @param expansions the polynomials along each axis
 * @returns sets x functions_u x functions_v x functions_w
 */
export function cellMoments(
	grid: CellGrid,
	weights: Float64Array,
	sets: number,
	expansions: [CellExpansion, CellExpansion, CellExpansion],
	checkpoint?: Checkpoint
): Float64Array {
	const [eu, ev, ew] = expansions;
	const { order, terms, sorted, local, starts, keys } = grid;
	const [, cv, cw] = grid.cells;
	const nu = eu.functions;
	const nv = ev.functions;
	const nw = ew.functions;
	const size = order + 1;
	const pairs = (size * (size + 1)) / 2;
	const out = new Float64Array(sets * nu * nv * nw);
	const cell = new Float64Array(terms * sets);
	const column = new Float64Array(pairs * sets * nw);
	const slab = new Float64Array(size * sets * nv * nw);
	const phi = new Float64Array(terms);
	const tx = new Float64Array(size + 1);
	const ty = new Float64Array(size + 1);
	const tz = new Float64Array(size + 1);

	const closeColumn = (b0: number) => {
		for (let a = 0, ab = 0; a < size; a++) {
			for (let b = 0; b < size - a; b++, ab++) {
				const coefficient = (b0 * size + b) * nv;
				for (let s = 0; s < sets; s++) {
					const from = (ab * sets + s) * nw;
					for (let j = 0; j < nv; j++) {
						const f = ev.coefficients[coefficient + j];
						const to = ((a * sets + s) * nv + j) * nw;
						for (let k = 0; k < nw; k++) slab[to + k] += f * column[from + k];
					}
				}
			}
		}
		column.fill(0);
	};
	const closeSlab = (a0: number) => {
		const plane = nv * nw;
		for (let a = 0; a < size; a++) {
			for (let s = 0; s < sets; s++) {
				const from = (a * sets + s) * plane;
				for (let i = 0; i < nu; i++) {
					const f = eu.coefficients[(a0 * size + a) * nu + i];
					const to = (s * nu + i) * plane;
					for (let k = 0; k < plane; k++) out[to + k] += f * slab[from + k];
				}
			}
		}
		slab.fill(0);
	};

	let columnKey = -1;
	for (let o = 0; o < keys.length; o++) {
		const c0 = keys[o] % cw;
		const key = (keys[o] - c0) / cw;
		if (key !== columnKey) {
			if (columnKey >= 0) {
				closeColumn(columnKey % cv);
				if (Math.floor(key / cv) !== Math.floor(columnKey / cv)) {
					closeSlab(Math.floor(columnKey / cv));
					checkpoint?.(o / keys.length);
				}
			}
			columnKey = key;
		}
		cell.fill(0);
		for (let i = starts[o]; i < starts[o + 1]; i++) {
			chebyshevProducts(order, local[3 * i], local[3 * i + 1], local[3 * i + 2], tx, ty, tz, phi);
			const at = sets * sorted[i];
			for (let s = 0; s < sets; s += 3) {
				const w0 = weights[at + s];
				const w1 = weights[at + s + 1];
				const w2 = weights[at + s + 2];
				const base = s * terms;
				for (let l = 0, m = base; l < terms; l++, m += 3) {
					const p = phi[l];
					cell[m] += w0 * p;
					cell[m + 1] += w1 * p;
					cell[m + 2] += w2 * p;
				}
			}
		}
		for (let s = 0; s < sets; s++) {
			const base = (s - (s % 3)) * terms + (s % 3);
			for (let a = 0, ab = 0, l = 0; a < size; a++) {
				for (let b = 0; b < size - a; b++, ab++) {
					const to = (ab * sets + s) * nw;
					for (let c = 0; c < size - a - b; c++, l++) {
						const m = cell[base + 3 * l];
						const from = (c0 * size + c) * nw;
						for (let k = 0; k < nw; k++) column[to + k] += m * ew.coefficients[from + k];
					}
				}
			}
		}
	}
	if (columnKey >= 0) {
		closeColumn(columnKey % cv);
		closeSlab(Math.floor(columnKey / cv));
	}
	return out;
}

/**
 * The transpose: values at the vertices of three fields with the given lattice coefficients.
 * @param lattice functions_u x functions_v x functions_w x 3, borrowed
 * @returns n x 3 in the vertices' own order
 */
export function cellValues(
	grid: CellGrid,
	lattice: Float64Array,
	expansions: [CellExpansion, CellExpansion, CellExpansion]
): Float64Array {
	const [eu, ev, ew] = expansions;
	const { order, terms, sorted, local, starts, keys } = grid;
	const [, cv, cw] = grid.cells;
	const nu = eu.functions;
	const nv = ev.functions;
	const nw = ew.functions;
	const size = order + 1;
	const pairs = (size * (size + 1)) / 2;
	const row = 3 * nw;
	const out = new Float64Array(3 * sorted.length);
	const slab = new Float64Array(size * nv * row);
	const column = new Float64Array(pairs * row);
	const cell = new Float64Array(3 * terms);
	const phi = new Float64Array(terms);
	const tx = new Float64Array(size + 1);
	const ty = new Float64Array(size + 1);
	const tz = new Float64Array(size + 1);
	let columnKey = -1;
	let slabKey = -1;
	for (let o = 0; o < keys.length; o++) {
		const c0 = keys[o] % cw;
		const key = (keys[o] - c0) / cw;
		if (key !== columnKey) {
			columnKey = key;
			const b0 = key % cv;
			const a0 = Math.floor(key / cv);
			if (a0 !== slabKey) {
				slabKey = a0;
				slab.fill(0);
				for (let a = 0; a < size; a++) {
					const to = a * nv * row;
					for (let i = 0; i < nu; i++) {
						const f = eu.coefficients[(a0 * size + a) * nu + i];
						const from = i * nv * row;
						for (let k = 0; k < nv * row; k++) slab[to + k] += f * lattice[from + k];
					}
				}
			}
			column.fill(0);
			for (let a = 0, ab = 0; a < size; a++) {
				for (let b = 0; b < size - a; b++, ab++) {
					const to = ab * row;
					for (let j = 0; j < nv; j++) {
						const f = ev.coefficients[(b0 * size + b) * nv + j];
						const from = (a * nv + j) * row;
						for (let k = 0; k < row; k++) column[to + k] += f * slab[from + k];
					}
				}
			}
		}
		for (let a = 0, ab = 0, l = 0; a < size; a++) {
			for (let b = 0; b < size - a; b++, ab++) {
				for (let c = 0; c < size - a - b; c++, l++) {
					const from = (c0 * size + c) * nw;
					const base = ab * row;
					let x = 0;
					let y = 0;
					let z = 0;
					for (let k = 0; k < nw; k++) {
						const f = ew.coefficients[from + k];
						x += f * column[base + 3 * k];
						y += f * column[base + 3 * k + 1];
						z += f * column[base + 3 * k + 2];
					}
					cell[3 * l] = x;
					cell[3 * l + 1] = y;
					cell[3 * l + 2] = z;
				}
			}
		}
		for (let i = starts[o]; i < starts[o + 1]; i++) {
			chebyshevProducts(order, local[3 * i], local[3 * i + 1], local[3 * i + 2], tx, ty, tz, phi);
			let x = 0;
			let y = 0;
			let z = 0;
			for (let l = 0, m = 0; l < terms; l++, m += 3) {
				const p = phi[l];
				x += p * cell[m];
				y += p * cell[m + 1];
				z += p * cell[m + 2];
			}
			const at = 3 * sorted[i];
			out[at] = x;
			out[at + 1] = y;
			out[at + 2] = z;
		}
	}
	return out;
}
