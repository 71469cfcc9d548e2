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

/** Vertices taken together by the moment kernel. */
const BLOCK = 4;
const CELL_STEPS = [1, 2, 4, 6, 8, 12, 16, 20, 24, 32, 40, 48, 64, 80, 96, 128];
const ORDERS = [4, 5, 6, 7, 8, 9];
/**
 * Bound of the truncation, relative to polynomials of largest value 1: for the metric, and for moves and gradients. The
 * bound adds the largest coefficients of all polynomials and cells; what is really lost is several times less
 * (tests/property/morph/paths.test.ts).
 */
export const METRIC_TOLERANCE = 2e-9;
export const FIELD_TOLERANCE = 2e-11;

/**
 * The cheapest cell grid that meets the tolerances for lattice degrees (by axis) and the metric's doubled degrees, or
 * null when none does. Costs are counted in multiply-adds.
 */
export function chooseCells(
	degrees: readonly [number, number, number],
	vertexCount: number
): { cells: [number, number, number]; order: number } | null {
	const kept = new Map<string, Float64Array>();
	const magnitudes = (degree: number, cells: number) => {
		const key = `${degree}/${cells}`;
		let found = kept.get(key);
		if (!found) {
			found = expandBernstein(degree, cells, 0).magnitudes;
			kept.set(key, found);
		}
		return found;
	};
	const meets = (factor: number, cells: number[], order: number, tolerance: number) => {
		const [u, v, w] = degrees.map((d, k) => magnitudes(factor * d, cells[k]));
		return truncationBound(u, v, w, order) <= tolerance;
	};
	const top = Math.max(...degrees);
	let best: { cells: [number, number, number]; order: number } | null = null;
	let bestCost = Infinity;
	for (const order of ORDERS) {
		for (const step of CELL_STEPS) {
			// Finer along the axis of higher degree.
			const cells = degrees.map((d) => Math.max(1, Math.ceil((step * d) / top))) as [number, number, number];
			if (!meets(1, cells, order, FIELD_TOLERANCE) || !meets(2, cells, order, METRIC_TOLERANCE)) continue;
			const terms = ((order + 1) * (order + 2) * (order + 3)) / 6;
			const pairs = ((order + 1) * (order + 2)) / 2;
			const [fu, fv, fw] = degrees.map((d) => 2 * d + 1);
			// A surface meets about three times the cells of a plane section.
			const columns = Math.min(vertexCount, cells[0] * cells[1]);
			const occupied = Math.min(vertexCount, 3 * Math.max(columns, cells[0] * cells[2], cells[1] * cells[2]));
			const cost =
				6 *
				(vertexCount * terms +
					occupied * terms * fw +
					columns * pairs * fv * fw +
					cells[0] * (order + 1) * fu * fv * fw);
			if (cost < bestCost) {
				bestCost = cost;
				best = { cells, order };
			}
			break;
		}
	}
	return best;
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

/**
 * How a cell's terms T_a(x) T_b(y) T_c(z) with a + b + c <= order are laid out: by c, and within c by pairs (a, b) of
 * rising a + b. So the pairs that go with c are the first `counts[c]` ones, and each c follows from the two before it by
 * one recurrence over whole runs.
 */
interface TermLayout {
	order: number;
	terms: number;
	pairA: Uint8Array;
	pairB: Uint8Array;
	/** Place of each pair when they are counted with b fastest, as columns are laid out. */
	slot: Uint8Array;
	/** Pairs that go with each c. */
	counts: Uint32Array;
	/** First term of each c. */
	offsets: Uint32Array;
}

function termLayout(order: number): TermLayout {
	const pairs = ((order + 1) * (order + 2)) / 2;
	const pairA = new Uint8Array(pairs);
	const pairB = new Uint8Array(pairs);
	const slot = new Uint8Array(pairs);
	for (let total = 0, l = 0; total <= order; total++) {
		for (let b = 0; b <= total; b++, l++) {
			const a = total - b;
			pairA[l] = a;
			pairB[l] = b;
			slot[l] = a * (order + 1) - (a * (a - 1)) / 2 + b;
		}
	}
	const counts = Uint32Array.from({ length: order + 1 }, (_, c) => ((order - c + 1) * (order - c + 2)) / 2);
	const offsets = new Uint32Array(order + 1);
	for (let c = 1; c <= order; c++) offsets[c] = offsets[c - 1] + counts[c - 1];
	return { order, terms: offsets[order] + counts[order], pairA, pairB, slot, counts, offsets };
}

/** Values of a cell's terms at one vertex. */
function termValues(
	layout: TermLayout,
	x: number,
	y: number,
	z: number,
	tx: Float64Array,
	ty: Float64Array,
	out: Float64Array
): void {
	const { order, pairA, pairB, counts, offsets } = layout;
	tx[0] = ty[0] = 1;
	tx[1] = x;
	ty[1] = y;
	const x2 = 2 * x;
	const y2 = 2 * y;
	const z2 = 2 * z;
	for (let k = 2; k <= order; k++) {
		tx[k] = x2 * tx[k - 1] - tx[k - 2];
		ty[k] = y2 * ty[k - 1] - ty[k - 2];
	}
	const pairs = counts[0];
	for (let l = 0; l < pairs; l++) out[l] = tx[pairA[l]] * ty[pairB[l]];
	const second = order > 0 ? counts[1] : 0;
	for (let l = 0; l < second; l++) out[pairs + l] = z * out[l];
	for (let c = 2; c <= order; c++) {
		const at = offsets[c];
		const before = offsets[c - 1];
		const twice = offsets[c - 2];
		const count = counts[c];
		for (let l = 0; l < count; l++) out[at + l] = z2 * out[before + l] - out[twice + l];
	}
}

/** Scratch of one vertex block: products of four vertices and the three recurrences. */
function makeScratch(order: number, terms: number) {
	return {
		phi: Array.from({ length: BLOCK }, () => new Float64Array(terms)),
		tx: new Float64Array(order + 2),
		ty: new Float64Array(order + 2)
	};
}

/**
 * target[to + i * length + k] += sum over t of coefficients[at + t * count + i] * source[from + t * stride + k], three
 * terms at a time, so that the target is read and written less often.
 */
function spread(
	target: Float64Array,
	to: number,
	coefficients: Float64Array,
	at: number,
	count: number,
	source: Float64Array,
	from: number,
	stride: number,
	terms: number,
	length: number
): void {
	for (let t = 0; t < terms; t += 3) {
		// Absent terms read the first one with the factor 0.
		const t1 = t + 1 < terms ? t + 1 : t;
		const t2 = t + 2 < terms ? t + 2 : t;
		const on1 = t + 1 < terms ? 1 : 0;
		const on2 = t + 2 < terms ? 1 : 0;
		const s0 = from + t * stride;
		const s1 = from + t1 * stride;
		const s2 = from + t2 * stride;
		for (let i = 0; i < count; i++) {
			const f0 = coefficients[at + t * count + i];
			const f1 = coefficients[at + t1 * count + i] * on1;
			const f2 = coefficients[at + t2 * count + i] * on2;
			const base = to + i * length;
			for (let k = 0; k < length; k++) {
				target[base + k] += f0 * source[s0 + k] + f1 * source[s1 + k] + f2 * source[s2 + k];
			}
		}
	}
}

/** Adds four vertices' products, weighted, to three sums per term. Weights of absent vertices are 0. */
function gatherBlock(
	cell: Float64Array,
	base: number,
	terms: number,
	phi: Float64Array[],
	weights: Float64Array,
	i0: number,
	i1: number,
	i2: number,
	i3: number,
	present: number
): void {
	const on1 = present > 1 ? 1 : 0;
	const on2 = present > 2 ? 1 : 0;
	const on3 = present > 3 ? 1 : 0;
	const a0 = weights[i0];
	const b0 = weights[i0 + 1];
	const d0 = weights[i0 + 2];
	const a1 = weights[i1] * on1;
	const b1 = weights[i1 + 1] * on1;
	const d1 = weights[i1 + 2] * on1;
	const a2 = weights[i2] * on2;
	const b2 = weights[i2 + 1] * on2;
	const d2 = weights[i2 + 2] * on2;
	const a3 = weights[i3] * on3;
	const b3 = weights[i3 + 1] * on3;
	const d3 = weights[i3 + 2] * on3;
	const phi0 = phi[0];
	const phi1 = phi[1];
	const phi2 = phi[2];
	const phi3 = phi[3];
	for (let l = 0, m = base; l < terms; l++, m += 3) {
		const p0 = phi0[l];
		const p1 = phi1[l];
		const p2 = phi2[l];
		const p3 = phi3[l];
		cell[m] += a0 * p0 + a1 * p1 + a2 * p2 + a3 * p3;
		cell[m + 1] += b0 * p0 + b1 * p1 + b2 * p2 + b3 * p3;
		cell[m + 2] += d0 * p0 + d1 * p1 + d2 * p2 + d3 * p3;
	}
}

/** One group of three: cell sums (terms x 3) to the column's polynomials in w (pairs x functions_w x 3). */
function spreadCell(
	layout: TermLayout,
	column: Float64Array,
	columnStart: number,
	columnStride: number,
	cell: Float64Array,
	cellStart: number,
	coefficients: Float64Array,
	coefficientStart: number,
	functions: number
): void {
	const { order, slot, counts } = layout;
	let m = cellStart;
	for (let c = 0; c <= order; c++) {
		const from = coefficientStart + c * functions;
		const count = counts[c];
		for (let l = 0; l < count; l++, m += 3) {
			const m0 = cell[m];
			const m1 = cell[m + 1];
			const m2 = cell[m + 2];
			for (let k = 0, at = columnStart + slot[l] * columnStride; k < functions; k++, at += 3) {
				const f = coefficients[from + k];
				column[at] += m0 * f;
				column[at + 1] += m1 * f;
				column[at + 2] += m2 * f;
			}
		}
	}
}

/**
 * Moments: for each of `sets` weights per vertex, sum over vertices of weight * A_i(u) B_j(v) C_k(w).
 * @param weights n x sets, in the vertices' own order, borrowed; sets a multiple of 3
 * @param expansions the polynomials along each axis
 * @returns sets/3 x functions_u x functions_v x functions_w x 3: the weights in groups of three, innermost
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
	const groups = sets / 3;
	const row = 3 * nw;
	const plane = nv * row;
	const out = new Float64Array(groups * nu * plane);
	const cell = new Float64Array(terms * sets);
	const column = new Float64Array(pairs * groups * row);
	const slab = new Float64Array(size * groups * plane);
	const layout = termLayout(order);
	const { phi, tx, ty } = makeScratch(order, terms);
	for (let o = 0; o < keys.length; o++) {
		const key = keys[o];
		const c0 = key % cw;
		cell.fill(0);
		const last = starts[o + 1];
		for (let i = starts[o]; i < last; i += BLOCK) {
			const here = Math.min(BLOCK, last - i);
			for (let q = 0; q < here; q++) {
				const at = 3 * (i + q);
				termValues(layout, local[at], local[at + 1], local[at + 2], tx, ty, phi[q]);
			}
			// Four vertices at a time, so that each sum is read and written once for four products.
			const i0 = sets * sorted[i];
			const i1 = here > 1 ? sets * sorted[i + 1] : i0;
			const i2 = here > 2 ? sets * sorted[i + 2] : i0;
			const i3 = here > 3 ? sets * sorted[i + 3] : i0;
			for (let s = 0; s < sets; s += 3) {
				gatherBlock(cell, s * terms, terms, phi, weights, i0 + s, i1 + s, i2 + s, i3 + s, here);
			}
		}
		for (let g = 0; g < groups; g++) {
			spreadCell(layout, column, g * row, groups * row, cell, 3 * g * terms, ew.coefficients, c0 * size * nw, nw);
		}
		// Close the column, and the slab, when the next cell lies in another one.
		const line = (key - c0) / cw;
		const nextLine = o + 1 < keys.length ? Math.floor(keys[o + 1] / cw) : -1;
		if (nextLine === line) continue;
		const b0 = line % cv;
		const a0 = (line - b0) / cv;
		for (let a = 0, ab = 0; a < size; ab += size - a, a++) {
			for (let g = 0; g < groups; g++) {
				const to = (a * groups + g) * plane;
				const from = (ab * groups + g) * row;
				spread(slab, to, ev.coefficients, b0 * size * nv, nv, column, from, groups * row, size - a, row);
			}
		}
		column.fill(0);
		if (nextLine >= 0 && Math.floor(nextLine / cv) === a0) continue;
		for (let g = 0; g < groups; g++) {
			const stride = groups * plane;
			spread(out, g * nu * plane, eu.coefficients, a0 * size * nu, nu, slab, g * plane, stride, size, plane);
		}
		slab.fill(0);
		checkpoint?.((o + 1) / keys.length);
	}
	return out;
}

/** out[to + k] += sum over i of coefficients[at + i] source[i * length + from + k]: the transpose of spread. */
function collect(
	target: Float64Array,
	to: number,
	coefficients: Float64Array,
	at: number,
	count: number,
	source: Float64Array,
	from: number,
	length: number
): void {
	for (let i = 0; i < count; i++) {
		const f = coefficients[at + i];
		const base = from + i * length;
		for (let k = 0; k < length; k++) target[to + k] += f * source[base + k];
	}
}

/** The transpose of spreadCell: the cell's terms x 3 from the column's polynomials in w. */
function collectCell(
	layout: TermLayout,
	cell: Float64Array,
	column: Float64Array,
	columnStride: number,
	coefficients: Float64Array,
	coefficientStart: number,
	functions: number
): void {
	const { order, slot, counts } = layout;
	let m = 0;
	for (let c = 0; c <= order; c++) {
		const from = coefficientStart + c * functions;
		const count = counts[c];
		for (let l = 0; l < count; l++, m += 3) {
			let x = 0;
			let y = 0;
			let z = 0;
			for (let k = 0, at = slot[l] * columnStride; k < functions; k++, at += 3) {
				const f = coefficients[from + k];
				x += f * column[at];
				y += f * column[at + 1];
				z += f * column[at + 2];
			}
			cell[m] = x;
			cell[m + 1] = y;
			cell[m + 2] = z;
		}
	}
}

/** Sum over the terms of one vertex's products times the cell's coefficients. */
function valueAt(out: Float64Array, at: number, phi: Float64Array, cell: Float64Array, terms: number): void {
	let x = 0;
	let y = 0;
	let z = 0;
	for (let l = 0, m = 0; l < terms; l++, m += 3) {
		const p = phi[l];
		x += p * cell[m];
		y += p * cell[m + 1];
		z += p * cell[m + 2];
	}
	out[at] = x;
	out[at + 1] = y;
	out[at + 2] = z;
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
	const plane = nv * row;
	const out = new Float64Array(3 * sorted.length);
	const slab = new Float64Array(size * plane);
	const column = new Float64Array(pairs * row);
	const cell = new Float64Array(3 * terms);
	const layout = termLayout(order);
	const { phi, tx, ty } = makeScratch(order, terms);
	let columnKey = -1;
	let slabKey = -1;
	for (let o = 0; o < keys.length; o++) {
		const c0 = keys[o] % cw;
		const line = (keys[o] - c0) / cw;
		if (line !== columnKey) {
			columnKey = line;
			const b0 = line % cv;
			const a0 = (line - b0) / cv;
			if (a0 !== slabKey) {
				slabKey = a0;
				slab.fill(0);
				for (let a = 0; a < size; a++) {
					collect(slab, a * plane, eu.coefficients, (a0 * size + a) * nu, nu, lattice, 0, plane);
				}
			}
			column.fill(0);
			for (let a = 0, ab = 0; a < size; a++) {
				for (let b = 0; b < size - a; b++, ab++) {
					collect(column, ab * row, ev.coefficients, (b0 * size + b) * nv, nv, slab, a * plane, row);
				}
			}
		}
		collectCell(layout, cell, column, row, ew.coefficients, c0 * size * nw, nw);
		for (let i = starts[o]; i < starts[o + 1]; i++) {
			termValues(layout, local[3 * i], local[3 * i + 1], local[3 * i + 2], tx, ty, phi[0]);
			valueAt(out, 3 * sorted[i], phi[0], cell, terms);
		}
	}
	return out;
}
