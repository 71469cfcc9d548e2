import type { DesignBox } from './types';

/** A one-dimensional basis on [0, 1]. */
export interface Basis {
	/** Number of control points. */
	count: number;
	degree: number;
	/** Clamped knot vector for a B-spline, else null (Bernstein). */
	knots: Float64Array | null;
	/** Greville abscissae: the control points that reproduce t itself. */
	greville: Float64Array;
}

export function bernsteinBasis(count: number): Basis {
	const degree = count - 1;
	return { count, degree, knots: null, greville: Float64Array.from({ length: count }, (_, i) => i / degree) };
}

/** Clamped uniform B-spline; the degree must be below the number of points. */
export function bsplineBasis(count: number, degree: number): Basis {
	const spans = count - degree;
	const knots = new Float64Array(count + degree + 1);
	for (let i = 0; i < knots.length; i++) knots[i] = Math.min(1, Math.max(0, (i - degree) / spans));
	const greville = new Float64Array(count);
	for (let i = 0; i < count; i++) {
		let sum = 0;
		for (let k = 1; k <= degree; k++) sum += knots[i + k];
		greville[i] = sum / degree;
	}
	return { count, degree, knots, greville };
}

/** The three bases of a box. */
export function boxBases(box: DesignBox): [Basis, Basis, Basis] {
	const of = (count: number) =>
		box.basis === 'bspline' ? bsplineBasis(count, box.degree ?? 3) : bernsteinBasis(count);
	return [of(box.lattice[0]), of(box.lattice[1]), of(box.lattice[2])];
}

/**
 * All Bernstein polynomials of a degree at t by the triangle recurrence of de Casteljau (no powers, so no cancellation
 * at high degrees; Farin, Curves and Surfaces for CAGD, ch. 5).
 * @param out degree + 1 values at offset `at`, overwritten
 */
export function bernstein(degree: number, t: number, out: Float64Array, at = 0): void {
	const s = 1 - t;
	out[at] = 1;
	for (let j = 1; j <= degree; j++) {
		let carried = 0;
		for (let k = 0; k < j; k++) {
			const value = out[at + k];
			out[at + k] = carried + s * value;
			carried = t * value;
		}
		out[at + j] = carried;
	}
}

/**
 * Nonzero B-spline functions at t by the recurrence of Cox and de Boor (Piegl and Tiller, The NURBS Book, A2.2).
 * @param out degree + 1 values, overwritten
 * @returns index of the first nonzero function
 */
export function bsplineValues(knots: Float64Array, degree: number, t: number, out: Float64Array): number {
	const count = knots.length - degree - 1;
	let span = degree;
	while (span < count - 1 && t >= knots[span + 1]) span++;
	out[0] = 1;
	for (let j = 1; j <= degree; j++) {
		let saved = 0;
		for (let r = 0; r < j; r++) {
			const right = knots[span + r + 1] - t;
			const left = t - knots[span + 1 - j + r];
			const temp = out[r] / (right + left);
			out[r] = saved + right * temp;
			saved = left * temp;
		}
		out[j] = saved;
	}
	return span - degree;
}

/** Values and first derivatives of all functions of a basis at t, each of length count, overwritten. */
export function evaluateBasis(basis: Basis, t: number, values: Float64Array, slopes: Float64Array): void {
	const { count, degree, knots } = basis;
	if (!knots) {
		// The derivative comes from the degree below: B'_i = n (B_{i-1,n-1} - B_{i,n-1}).
		bernstein(degree - 1, t, slopes);
		slopes[degree] = 0;
		let before = 0;
		for (let i = 0; i <= degree; i++) {
			const low = slopes[i];
			values[i] = (1 - t) * low + t * before;
			slopes[i] = degree * (before - low);
			before = low;
		}
		return;
	}
	values.fill(0, 0, count);
	slopes.fill(0, 0, count);
	const local = new Float64Array(degree + 1);
	const first = bsplineValues(knots, degree, t, local);
	for (let k = 0; k <= degree; k++) values[first + k] = local[k];
	if (degree === 0) return;
	// N'_i = p (N_{i,p-1} / (u_{i+p} - u_i) - N_{i+1,p-1} / (u_{i+p+1} - u_{i+1})); the inner vector drops one knot a side.
	const lower = new Float64Array(degree);
	const inner = knots.subarray(1, knots.length - 1);
	const lowFirst = bsplineValues(inner, degree - 1, t, lower) + 1;
	for (let k = 0; k < degree; k++) {
		const i = lowFirst + k;
		const q = (degree * lower[k]) / (knots[i + degree] - knots[i]);
		slopes[i] += q;
		slopes[i - 1] -= q;
	}
}
