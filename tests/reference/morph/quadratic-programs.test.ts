import { describe, expect, it } from 'vitest';
import { MorphError } from '../../../src/lib/morph';
import { solveActiveSet } from '../../../src/lib/morph/active-set';
import { solveQuadraticProgram, type QuadraticProgram } from '../../../src/lib/morph/qp';

/** A published problem, min 1/2 x'Hx + g'x + constant with its rows, and its published solution. */
interface Published extends QuadraticProgram {
	name: string;
	constant: number;
	x: number[];
	value: number;
	/** Multipliers, where the source gives them. */
	lambda?: number[];
}

const unit = (n: number, i: number, sign = 1) => Array.from({ length: n }, (_, k) => (k === i ? sign : 0));

const PUBLISHED: Published[] = [
	{
		name: 'Nocedal and Wright, Numerical Optimization, 2nd ed., example 16.2 (from memory)',
		hessian: [
			[6, 2, 1],
			[2, 5, 2],
			[1, 2, 4]
		],
		gradient: [-8, -3, -3],
		constant: 0,
		rows: [
			[1, 0, 1],
			[0, 1, 1]
		],
		bounds: [3, 0],
		equalities: 2,
		x: [2, -1, 1],
		value: -3.5,
		lambda: [3, -2]
	},
	{
		name: 'Nocedal and Wright, example 16.4 (also in the documentation of scipy.optimize.minimize, with the multipliers)',
		hessian: [
			[2, 0],
			[0, 2]
		],
		gradient: [-2, -5],
		constant: 7.25,
		rows: [
			[1, -2],
			[-1, -2],
			[-1, 2],
			[1, 0],
			[0, 1]
		],
		bounds: [-2, -6, -2, 0, 0],
		equalities: 0,
		x: [1.4, 1.7],
		value: 0.8,
		lambda: [0.8, 0, 0, 0, 0]
	},
	{
		name: 'Goldfarb and Idnani 1983, the worked example (data as in the tests of the R package quadprog)',
		hessian: [
			[4, -2],
			[-2, 4]
		],
		gradient: [6, 0],
		constant: 0,
		rows: [
			[1, 0],
			[0, 1],
			[1, 1]
		],
		bounds: [0, 0, 2],
		equalities: 0,
		x: [0.5, 1.5],
		value: 6.5
	},
	{
		name: 'the example of solve.QP in the R package quadprog',
		hessian: [
			[1, 0, 0],
			[0, 1, 0],
			[0, 0, 1]
		],
		gradient: [0, -5, 0],
		constant: 0,
		rows: [
			[-4, -3, 0],
			[2, 1, 0],
			[0, -2, 1]
		],
		bounds: [-8, 2, 0],
		equalities: 0,
		x: [10 / 21, 22 / 21, 44 / 21],
		value: -2.380952381
	},
	{
		name: 'Hock and Schittkowski 1981, problem 21',
		hessian: [
			[0.02, 0],
			[0, 2]
		],
		gradient: [0, 0],
		constant: -100,
		rows: [[10, -1], unit(2, 0), unit(2, 0, -1), unit(2, 1), unit(2, 1, -1)],
		bounds: [10, 2, -50, -50, -50],
		equalities: 0,
		x: [2, 0],
		value: -99.96
	},
	{
		name: 'Hock and Schittkowski 1981, problem 35',
		hessian: [
			[4, 2, 2],
			[2, 4, 0],
			[2, 0, 2]
		],
		gradient: [-8, -6, -4],
		constant: 9,
		rows: [[-1, -1, -2], unit(3, 0), unit(3, 1), unit(3, 2)],
		bounds: [-3, 0, 0, 0],
		equalities: 0,
		x: [4 / 3, 7 / 9, 4 / 9],
		value: 1 / 9
	},
	{
		name: 'Hock and Schittkowski 1981, problem 76',
		hessian: [
			[2, 0, -1, 0],
			[0, 1, 0, 0],
			[-1, 0, 2, 1],
			[0, 0, 1, 1]
		],
		gradient: [-1, -3, 1, -1],
		constant: 0,
		rows: [[-1, -2, -1, -1], [-3, -1, -2, 1], [0, 1, 4, 0], unit(4, 0), unit(4, 1), unit(4, 2), unit(4, 3)],
		bounds: [-5, -4, 1.5, 0, 0, 0, 0],
		equalities: 0,
		x: [3 / 11, 23 / 11, 0, 6 / 11],
		value: -4.681818182
	}
];

/** Plain elimination with pivoting, on copies. */
function eliminate(matrix: number[][], right: number[]): number[] {
	const n = right.length;
	const a = matrix.map((row, i) => [...row, right[i]]);
	for (let k = 0; k < n; k++) {
		const pivot = a.slice(k).reduce((best, row, i) => (Math.abs(row[k]) > Math.abs(a[best][k]) ? k + i : best), k);
		[a[k], a[pivot]] = [a[pivot], a[k]];
		for (let i = k + 1; i < n; i++) {
			const f = a[i][k] / a[k][k];
			for (let j = k; j <= n; j++) a[i][j] -= f * a[k][j];
		}
	}
	const x = new Array<number>(n).fill(0);
	for (let i = n - 1; i >= 0; i--) x[i] = (a[i][n] - a[i].slice(0, n).reduce((s, c, j) => s + c * x[j], 0)) / a[i][i];
	return x;
}
const dot = (a: number[], b: number[]) => a.reduce((s, x, i) => s + x * b[i], 0);

/** The same program as the active-set method takes it: by inner products in the inverse of the Hessian. */
function byActiveSet({ hessian, gradient, rows, bounds, equalities }: QuadraticProgram, guess?: boolean[]) {
	const free = eliminate(hessian, gradient).map((v) => -v);
	const solved = rows.map((row) => eliminate(hessian, row));
	const scale = rows.map((row, i) => Math.sqrt(dot(row, solved[i])));
	const { multipliers, active, conflict } = solveActiveSet({
		// Symmetric to the last bit, as the factorisation asks.
		gram: rows.map((row, i) =>
			rows.map((other, j) => (dot(row, solved[j]) + dot(other, solved[i])) / (2 * scale[i] * scale[j]))
		),
		slack: rows.map((row, i) => (dot(row, free) - bounds[i]) / scale[i]),
		equality: rows.map((_, i) => i < equalities),
		tolerance: rows.map(() => 1e-13),
		guess
	});
	const lambda = multipliers.map((m, i) => m / scale[i]);
	const x = free.map((f, k) => f + lambda.reduce((s, l, i) => s + l * solved[i][k], 0));
	return { x, multipliers: lambda, active, conflict };
}

const valueOf = (p: Published, x: number[]) =>
	p.constant +
	dot(p.gradient, x) +
	0.5 *
		dot(
			x,
			p.hessian.map((row) => dot(row, x))
		);

/** Karush, Kuhn and Tucker: the conditions that make a feasible point of a convex program the optimum. */
function expectOptimal(p: Published, x: number[], lambda: number[]) {
	p.x.forEach((wanted, i) => expect(x[i]).toBeCloseTo(wanted, 10));
	expect(valueOf(p, x)).toBeCloseTo(p.value, 8);
	p.lambda?.forEach((wanted, i) => expect(lambda[i]).toBeCloseTo(wanted, 10));
	for (let k = 0; k < x.length; k++) {
		const gradient = p.gradient[k] + dot(p.hessian[k], x);
		expect(gradient).toBeCloseTo(
			lambda.reduce((s, l, i) => s + l * p.rows[i][k], 0),
			10
		);
	}
	p.rows.forEach((row, i) => {
		const slack = dot(row, x) - p.bounds[i];
		if (i < p.equalities) return expect(slack).toBeCloseTo(0, 10);
		expect(slack).toBeGreaterThan(-1e-10);
		expect(lambda[i]).toBeGreaterThan(-1e-12);
		expect(lambda[i] * slack).toBeCloseTo(0, 9);
	});
}

describe('quadratic programs with published solutions', () => {
	it.each(PUBLISHED)('$name: by numeric.solveQP', (problem) => {
		const { x, value, multipliers } = solveQuadraticProgram(problem);
		expectOptimal(problem, x, multipliers);
		expect(value + problem.constant).toBeCloseTo(problem.value, 8);
	});

	it.each(PUBLISHED)('$name: by the active-set method, from any guess', (problem) => {
		const m = problem.rows.length;
		for (let bits = 0; bits < 2 ** m; bits++) {
			const guess = problem.rows.map((_, i) => (bits >> i) % 2 === 1);
			const { x, multipliers, conflict } = byActiveSet(problem, bits === 0 ? undefined : guess);
			expect(conflict).toBeNull();
			expectOptimal(problem, x, multipliers);
		}
	});

	it('rows that repeat each other do no harm to the active-set method', () => {
		const problem = PUBLISHED[1];
		const doubled = {
			...problem,
			rows: [...problem.rows, ...problem.rows.map((row) => row.map((c) => 3 * c))],
			bounds: [...problem.bounds, ...problem.bounds.map((b) => 3 * b)]
		};
		const { x, conflict } = byActiveSet(doubled);
		expect(conflict).toBeNull();
		problem.x.forEach((wanted, i) => expect(x[i]).toBeCloseTo(wanted, 10));
	});

	it('both find a contradiction', () => {
		const impossible: QuadraticProgram = {
			hessian: [
				[1, 0],
				[0, 1]
			],
			gradient: [0, 0],
			rows: [
				[1, 0],
				[-1, 0],
				[0, 1]
			],
			bounds: [1, 1, 5],
			equalities: 0
		};
		expect(() => solveQuadraticProgram(impossible)).toThrow(MorphError);
		// It names the two that contradict each other, not the third.
		expect(byActiveSet(impossible).conflict?.sort()).toEqual([0, 1]);
	});

	it('a form that is not positive definite is refused', () => {
		const flat: QuadraticProgram = {
			hessian: [
				[1, 1],
				[1, 1]
			],
			gradient: [1, 1],
			rows: [],
			bounds: [],
			equalities: 0
		};
		expect(() => solveQuadraticProgram(flat)).toThrow(/positive definite/);
	});
});
