import { bernstein } from './basis';

/**
 * Chebyshev expansion of the Bernstein polynomials of one degree on equal cells of [0, 1].
 * On cell s, with local coordinate x in [-1, 1]: B_i(t) = sum over k of coefficient[s][k][i] T_k(x).
 */
export interface CellExpansion {
	cells: number;
	/** Polynomials: degree + 1. */
	functions: number;
	/** Kept terms per cell: order + 1. */
	terms: number;
	/** cells x terms x functions */
	coefficients: Float64Array;
	/** Largest |coefficient| of each order 0..degree over cells and polynomials, kept or not: bounds what is dropped. */
	magnitudes: Float64Array;
}

/** Expands exactly (degree + 1 Chebyshev nodes per cell), then keeps orders 0..order. */
export function expandBernstein(degree: number, cells: number, order: number): CellExpansion {
	const functions = degree + 1;
	const nodes = degree + 1;
	const terms = order + 1;
	const coefficients = new Float64Array(cells * terms * functions);
	const magnitudes = new Float64Array(degree + 1);
	const samples = new Float64Array(nodes * functions);
	const cosines = new Float64Array(nodes * (degree + 1));
	for (let q = 0; q < nodes; q++) {
		for (let k = 0; k <= degree; k++) cosines[q * (degree + 1) + k] = Math.cos((Math.PI * k * (q + 0.5)) / nodes);
	}
	const row = new Float64Array(functions);
	for (let s = 0; s < cells; s++) {
		for (let q = 0; q < nodes; q++) {
			const x = Math.cos((Math.PI * (q + 0.5)) / nodes);
			bernstein(degree, (s + 0.5 + 0.5 * x) / cells, samples, q * functions);
		}
		for (let k = 0; k <= degree; k++) {
			row.fill(0);
			for (let q = 0; q < nodes; q++) {
				const c = cosines[q * (degree + 1) + k];
				for (let i = 0; i < functions; i++) row[i] += c * samples[q * functions + i];
			}
			const scale = (k === 0 ? 1 : 2) / nodes;
			for (let i = 0; i < functions; i++) {
				const value = row[i] * scale;
				if (k <= order) coefficients[(s * terms + k) * functions + i] = value;
				magnitudes[k] = Math.max(magnitudes[k], Math.abs(value));
			}
		}
	}
	return { cells, functions, terms, coefficients, magnitudes };
}

/**
 * Bound of what is lost when products of three expansions are cut at a total order: the sum of the products of
 * magnitudes over a + b + c > order.
 */
export function truncationBound(u: Float64Array, v: Float64Array, w: Float64Array, order: number): number {
	// Tails of w first, so that the sum takes two loops.
	const tail = new Float64Array(w.length + 1);
	for (let c = w.length - 1; c >= 0; c--) tail[c] = tail[c + 1] + w[c];
	let sum = 0;
	for (let a = 0; a < u.length; a++) {
		for (let b = 0; b < v.length; b++) {
			const from = Math.max(0, order + 1 - a - b);
			if (from < w.length) sum += u[a] * v[b] * tail[from];
		}
	}
	return sum;
}
