import { CholeskyDecomposition, Matrix } from 'ml-matrix';
import numeric from 'numeric';
import { MorphError } from './errors';

export interface QuadraticProgram {
	/** n x n, symmetric positive definite, row by row. */
	hessian: number[][];
	/** n */
	gradient: number[];
	/** m x n, the first `equalities` rows hold with =, the others with >=. */
	rows: number[][];
	/** m */
	bounds: number[];
	equalities: number;
}

export interface QuadraticSolution {
	x: number[];
	/** 1/2 x'Hx + g'x */
	value: number;
	/** m Lagrange multipliers of g + Hx = rows' multipliers: >= 0 for inequalities, 0 when inactive. */
	multipliers: number[];
	/** m */
	active: boolean[];
}

/**
 * min 1/2 x'Hx + g'x subject to rows x = (first) or >= bounds, by the dual method of Goldfarb and Idnani (1983,
 * numeric.solveQP). The multipliers come from the active rows: (A H^-1 A') lambda = A (x + H^-1 g).
 * @throws MorphError metric-singular when H is not positive definite; constraint-conflict when nothing is feasible
 */
export function solveQuadraticProgram(program: QuadraticProgram): QuadraticSolution {
	const { hessian, gradient, rows, bounds, equalities } = program;
	const n = gradient.length;
	const factor = new CholeskyDecomposition(new Matrix(hessian));
	if (!factor.isPositiveDefinite()) {
		throw new MorphError(
			'metric-singular',
			'The quadratic form is not positive definite.',
			'Remove constraints that repeat each other.'
		);
	}
	const free = factor.solve(Matrix.columnVector(gradient)).to1DArray();
	const m = rows.length;
	const multipliers = new Array<number>(m).fill(0);
	const active = new Array<boolean>(m).fill(false);
	if (m === 0) {
		const x = free.map((v) => -v);
		return { x, value: x.reduce((sum, v, i) => sum + 0.5 * v * gradient[i], 0), multipliers, active };
	}
	const columns = Array.from({ length: n }, (_, i) => rows.map((row) => row[i]));
	const result = numeric.solveQP(
		hessian,
		gradient.map((g) => -g),
		columns,
		bounds,
		equalities
	);
	if (result.message !== '') {
		throw new MorphError(
			'constraint-conflict',
			'The constraints contradict each other: no move keeps all of them.',
			'Relax or remove one of them.'
		);
	}
	const x = Array.from({ length: n }, (_, i) => result.solution[i]);
	const indices = result.iact.filter((k) => k > 0).map((k) => k - 1);
	if (indices.length > 0) {
		const a = new Matrix(indices.map((k) => rows[k]));
		const z = factor.solve(a.transpose());
		const product = a.mmul(z);
		// The factorisation asks for symmetry to the last bit.
		const system = product.add(product.transpose()).mul(0.5);
		const right = indices.map((k) => rows[k].reduce((sum, c, i) => sum + c * (x[i] + free[i]), 0));
		const lambda = new CholeskyDecomposition(system).solve(Matrix.columnVector(right)).to1DArray();
		indices.forEach((k, i) => {
			multipliers[k] = lambda[i];
			active[k] = true;
		});
	}
	let value = 0;
	for (let i = 0; i < n; i++) {
		value += gradient[i] * x[i];
		for (let j = 0; j < n; j++) value += 0.5 * x[i] * hessian[i][j] * x[j];
	}
	return { x, value, multipliers, active };
}
