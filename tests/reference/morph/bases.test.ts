import { describe, expect, it } from 'vitest';
import { bernstein, bernsteinBasis, bsplineBasis, bsplineValues, evaluateBasis } from '../../../src/lib/morph/basis';
import type { Basis } from '../../../src/lib/morph/basis';
import { elevate, productTables } from '../../../src/lib/morph/metric';

const bernsteinAt = (degree: number, t: number) => {
	const out = new Float64Array(degree + 1);
	bernstein(degree, t, out);
	return Array.from(out);
};
const at = (basis: Basis, t: number) => {
	const values = new Float64Array(basis.count);
	const slopes = new Float64Array(basis.count);
	evaluateBasis(basis, t, values, slopes);
	return { values: Array.from(values), slopes: Array.from(slopes) };
};
const close = (found: number[], wanted: number[], digits = 14) => {
	expect(found).toHaveLength(wanted.length);
	wanted.forEach((w, i) => expect(found[i]).toBeCloseTo(w, digits));
};
/** A clamped or other B-spline basis from the knots of a worked example. */
const withKnots = (knots: number[], degree: number): Basis => ({
	count: knots.length - degree - 1,
	degree,
	knots: Float64Array.from(knots),
	greville: new Float64Array(knots.length - degree - 1)
});
/** Gauss-Legendre, five points: exact to degree 9 (Abramowitz and Stegun, table 25.4). */
const NODES = [-0.906179845938664, -0.538469310105683, 0, 0.538469310105683, 0.906179845938664];
const WEIGHTS = [0.236926885056189, 0.478628670499366, 0.568888888888889, 0.478628670499366, 0.236926885056189];
const integral = (f: (t: number) => number, from: number, to: number) =>
	NODES.reduce((s, x, k) => s + 0.5 * (to - from) * WEIGHTS[k] * f(0.5 * (from + to) + 0.5 * (to - from) * x), 0);

describe('Bernstein polynomials', () => {
	it('have the values of their definition: B_3(1/4) = (27, 27, 9, 1) / 64, B_4(1/3) = (16, 32, 24, 8, 1) / 81', () => {
		close(
			bernsteinAt(3, 1 / 4),
			[27, 27, 9, 1].map((x) => x / 64)
		);
		close(
			bernsteinAt(4, 1 / 3),
			[16, 32, 24, 8, 1].map((x) => x / 81)
		);
		close(
			at(bernsteinBasis(5), 1 / 3).values,
			[16, 32, 24, 8, 1].map((x) => x / 81)
		);
		// B_{3,1} is largest at 1/3, with 4/9.
		expect(bernsteinAt(3, 1 / 3)[1]).toBeCloseTo(4 / 9, 15);
		expect(at(bernsteinBasis(4), 1 / 3).slopes[1]).toBeCloseTo(0, 14);
	});

	// Farin, Curves and Surfaces for CAGD, ch. 4 and 6 (worked example, from memory; the numbers follow by hand).
	const POLYGON = [
		[0, 0],
		[0, 2],
		[8, 2],
		[4, 0]
	];
	const pointOf = (polygon: number[][], t: number) =>
		[0, 1].map((d) => bernsteinAt(polygon.length - 1, t).reduce((s, b, i) => s + b * polygon[i][d], 0));

	it("give Farin's cubic: (7/2, 3/2) at 1/2, (19/16, 9/8) at 1/4", () => {
		close(pointOf(POLYGON, 1 / 2), [7 / 2, 3 / 2]);
		close(pointOf(POLYGON, 1 / 4), [19 / 16, 9 / 8]);
	});

	it('are elevated as his polygon is: (0,0) (0,3/2) (4,2) (7,3/2) (4,0)', () => {
		close(Array.from(elevate(Float64Array.from(POLYGON.map((p) => p[0])))), [0, 0, 4, 7, 4]);
		close(Array.from(elevate(Float64Array.from(POLYGON.map((p) => p[1])))), [0, 3 / 2, 2, 3 / 2, 0]);
	});

	it('give the exercise (0,0) (0,27) (27,27) (27,0): (7, 18) at 1/3 and, beyond the interval, (-729, -486) at 3', () => {
		// A public exercise page gives the points; the answers follow by hand.
		const polygon = [
			[0, 0],
			[0, 27],
			[27, 27],
			[27, 0]
		];
		close(pointOf(polygon, 1 / 3), [7, 18], 12);
		close(pointOf(polygon, 3), [-729, -486], 10);
	});

	it.each([2, 4, 7, 12, 20])('of %i points: ends of the slope n, integrals 1 / (n + 1)', (count) => {
		// Farin, ch. 5 and 6: b'(0) = n (b1 - b0), b'(1) = n (bn - bn-1).
		const n = count - 1;
		const basis = bernsteinBasis(count);
		const [left, right] = [at(basis, 0).slopes, at(basis, 1).slopes];
		close(
			left,
			left.map((_, i) => (i === 0 ? -n : i === 1 ? n : 0))
		);
		close(
			right,
			right.map((_, i) => (i === n ? n : i === n - 1 ? -n : 0))
		);
		for (let i = 0; i < count; i++) {
			let sum = 0;
			for (let k = 0; k < 32; k++) sum += integral((t) => at(basis, t).values[i], k / 32, (k + 1) / 32);
			expect(sum).toBeCloseTo(1 / (n + 1), 13);
		}
	});
});

describe('B-splines', () => {
	it('Piegl and Tiller, The NURBS Book, examples 2.3 and 2.4', () => {
		// Knots {0,0,0,1,2,3,4,4,5,5,5}, degree 2, u = 5/2 in span 4: N = 1/8, 6/8, 1/8; N' = -1/2, 0, 1/2.
		const basis = withKnots([0, 0, 0, 1, 2, 3, 4, 4, 5, 5, 5], 2);
		const out = new Float64Array(3);
		expect(bsplineValues(basis.knots!, 2, 5 / 2, out)).toBe(4 - 2);
		close(Array.from(out), [1 / 8, 6 / 8, 1 / 8]);
		const { values, slopes } = at(basis, 5 / 2);
		close(values, [0, 0, 1 / 8, 6 / 8, 1 / 8, 0, 0, 0]);
		close(slopes, [0, 0, -1 / 2, 0, 1 / 2, 0, 0, 0]);
		// Its Greville abscissae reproduce u.
		const greville = [0, 0.5, 1.5, 2.5, 3.5, 4, 4.5, 5];
		for (const u of [0, 0.3, 1.7, 2.5, 3.9, 4.2, 5]) {
			expect(at(basis, u).values.reduce((s, v, i) => s + v * greville[i], 0)).toBeCloseTo(u, 14);
		}
	});

	it('Shene, CS3621 Introduction to Computing with Geometry: knots {0,0,0,.3,.5,.5,.6,1,1,1}, u = 0.4', () => {
		close(at(withKnots([0, 0, 0, 0.3, 0.5, 0.5, 0.6, 1, 1, 1], 2), 0.4).values.slice(1, 4), [1 / 10, 13 / 20, 1 / 4]);
	});

	it.each([
		[4, 1],
		[4, 3],
		[7, 2],
		[9, 3]
	])(
		'clamped uniform, %i points of degree %i: integrals (u_{i+p+1} - u_i) / (p + 1), ends interpolated',
		(count, p) => {
			const basis = bsplineBasis(count, p);
			const knots = basis.knots!;
			const spans = count - p;
			for (let i = 0; i < count; i++) {
				let sum = 0;
				for (let k = 0; k < spans; k++) sum += integral((t) => at(basis, t).values[i], k / spans, (k + 1) / spans);
				expect(sum).toBeCloseTo((knots[i + p + 1] - knots[i]) / (p + 1), 13);
			}
			close(
				at(basis, 0).values,
				Array.from({ length: count }, (_, i) => (i === 0 ? 1 : 0))
			);
			close(
				at(basis, 1).values,
				Array.from({ length: count }, (_, i) => (i === count - 1 ? 1 : 0))
			);
		}
	);

	it('of one span are the Bernstein polynomials', () => {
		for (const t of [0, 0.2, 0.5, 0.9, 1]) {
			const [spline, polynomial] = [at(bsplineBasis(4, 3), t), at(bernsteinBasis(4), t)];
			close(spline.values, polynomial.values);
			close(spline.slopes, polynomial.slopes, 13);
		}
	});
});

describe('products', () => {
	// Farin, ch. 6: the product of Bernstein polynomials is one of the summed degree.
	it.each([2, 4, 7])('of %i polynomials and their slopes are those of the doubled degree', (count) => {
		const scale = 0.7;
		const tables = productTables(count - 1, scale);
		for (const t of [0, 0.13, 0.5, 0.81, 1]) {
			const { values, slopes } = at(bernsteinBasis(count), t);
			const doubled = bernsteinAt(2 * (count - 1), t);
			const sum = (table: Float64Array, i: number, j: number) =>
				doubled.reduce((s, b, k) => s + b * table[(i * count + j) * tables.functions + k], 0);
			for (let i = 0; i < count; i++) {
				for (let j = 0; j < count; j++) {
					expect(sum(tables.values, i, j)).toBeCloseTo(values[i] * values[j], 13);
					expect(sum(tables.slopeValue, i, j)).toBeCloseTo(scale * slopes[i] * values[j], 12);
					expect(sum(tables.valueSlope, i, j)).toBeCloseTo(scale * values[i] * slopes[j], 12);
					expect(sum(tables.slopes, i, j)).toBeCloseTo(scale * scale * slopes[i] * slopes[j], 11);
				}
			}
		}
	});
});
