import { solveActiveSet } from './active-set';
import { MorphError } from './errors';
import { solveQuadraticProgram } from './qp';
import { combine, dot, type Reduced } from './system';
import type { Bound } from './types';

/** A constraint on the move, linear in the displacement: row . d = / >= / <= change. */
export interface LinearConstraint {
	/** T'B'W of its gradient. */
	row: Reduced;
	/** H^-1 row */
	solved: Reduced;
	bound: Bound;
	/** Right-hand side: change of the constrained value by the move. */
	change: number;
	label: string;
	/** By how much an inequality may be broken, in its own unit. */
	tolerance?: number;
}

export interface DualSolution {
	/** Signed coefficients of the constraints' solved rows in the move. */
	mu: number[];
	active: boolean[];
}

/** The multipliers as they follow the length factor while the same constraints bind: mu = base + a slope. */
export interface DualLine {
	base: number[];
	slope: number[];
}

/** Rounding of a slack, relative to the largest. */
const SLACK = 1e-13;

/** Below this share of a gradient's own size its part inside the lattice counts as none. */
const NO_INFLUENCE = 1e-24;

/**
 * min g.d + 1/(2a) d'Hd subject to the constraints, solved in the dual: with d = -a H^-1 g + sum mu_j H^-1 c_j the
 * multipliers solve a quadratic program of one unknown per constraint (Nocedal and Wright, Numerical Optimization, 16.8).
 */
export class DualProblem {
	private readonly sign: number[];
	private readonly scale: number[];
	private readonly gram: number[][];
	private readonly along: number[];

	/** @param places how many of the last constraints are places of the surface */
	constructor(
		readonly constraints: LinearConstraint[],
		gradientSolved: Reduced,
		private readonly places = 0
	) {
		this.sign = constraints.map((c) => (c.bound === 'atMost' ? -1 : 1));
		const raw = constraints.map((c) => constraints.map((d) => dot(c.row, d.solved)));
		this.scale = raw.map((row, i) => Math.sqrt(Math.max(row[i], 0)));
		constraints.forEach((c, i) => {
			const size = dot(c.row, c.row);
			if (!(raw[i][i] > NO_INFLUENCE * size) || size === 0) {
				throw new MorphError(
					'constraint-invalid',
					`The constraint "${c.label}" does not depend on the control points that may move.`,
					'Remove it, or free control points where it acts.',
					{ constraint: i }
				);
			}
		});
		// Scaled to unit diagonal, so that volumes and newtons meet on equal terms; exact symmetry by averaging.
		this.gram = raw.map((row, i) =>
			row.map((_, j) =>
				i === j ? 1 : (this.sign[i] * this.sign[j] * 0.5 * (raw[i][j] + raw[j][i])) / (this.scale[i] * this.scale[j])
			)
		);
		this.along = constraints.map((c, i) => (this.sign[i] * dot(c.row, gradientSolved)) / this.scale[i]);
	}

	/**
	 * Multipliers for the length factor a.
	 * @param guess constraints that bound at another length factor, to begin with
	 */
	solve(a: number, guess?: boolean[]): DualSolution {
		if (this.constraints.length === 0) return { mu: [], active: [] };
		return this.places > 0 ? this.solveMany(a, guess) : this.solveFew(a);
	}

	/** With places of the surface: many rows that nearly repeat each other, of which few bind. */
	private solveMany(a: number, guess: boolean[] | undefined): DualSolution {
		const slack = this.constraints.map((c, i) => -a * this.along[i] - (this.sign[i] * c.change) / this.scale[i]);
		const largest = Math.max(...slack.map(Math.abs));
		const { multipliers, active, conflict } = solveActiveSet({
			gram: this.gram,
			slack,
			guess,
			equality: this.constraints.map((c) => c.bound === 'hold'),
			tolerance: this.constraints.map((c, i) => SLACK * largest + (c.tolerance ?? 0) / this.scale[i])
		});
		if (conflict) {
			throw new MorphError(
				'constraint-conflict',
				`The constraints ${this.labels(conflict.map((i) => this.constraints[i]))} contradict each other: no move keeps all of them.`,
				'Relax or remove one of them, or free more control points.'
			);
		}
		return { mu: multipliers.map((v, i) => (this.sign[i] * v) / this.scale[i]), active };
	}

	private labels(constraints: LinearConstraint[]): string {
		return [...new Set(constraints.map((c) => `"${c.label}"`))].join(', ');
	}

	private solveFew(a: number): DualSolution {
		// Equalities first, as the solver wants them; in the dual their multipliers are simply free.
		const gradient = this.constraints.map((c, i) => -(a * this.along[i] + (this.sign[i] * c.change) / this.scale[i]));
		const inequalities = this.constraints.map((_, i) => i).filter((i) => this.constraints[i].bound !== 'hold');
		let x: number[];
		let clamped: boolean[];
		try {
			const result = solveQuadraticProgram({
				hessian: this.gram,
				gradient,
				rows: inequalities.map((i) => this.constraints.map((_, j) => (i === j ? 1 : 0))),
				bounds: inequalities.map(() => 0),
				equalities: 0
			});
			x = result.x;
			clamped = result.active;
		} catch (error) {
			if (!(error instanceof MorphError)) throw error;
			throw new MorphError(
				'constraint-conflict',
				`The constraints ${this.labels(this.constraints)} repeat or contradict each other inside the boxes.`,
				'Remove one of them.'
			);
		}
		const active = this.constraints.map((c) => c.bound === 'hold');
		inequalities.forEach((i, k) => {
			active[i] = !clamped[k] && x[i] > 0;
			if (!active[i]) x[i] = 0;
		});
		return { mu: x.map((v, i) => (this.sign[i] * v) / this.scale[i]), active };
	}

	/** The multipliers while exactly these constraints bind. */
	line(active: boolean[]): DualLine {
		const kept = this.constraints.map((_, i) => i).filter((i) => active[i]);
		const of = (right: (i: number) => number) => this.shares(kept, kept.map(right));
		return {
			base: of((i) => -(this.sign[i] * this.constraints[i].change) / this.scale[i]),
			slope: of((i) => -this.along[i])
		};
	}

	/**
	 * A correction that changes one constraint's value and, to first order, none of the other active ones, shortest in
	 * the metric: returns coefficients of the solved rows.
	 */
	correction(index: number, active: boolean[]): number[] {
		const kept = this.constraints.map((_, i) => i).filter((i) => i === index || active[i]);
		// With no other constraint this is H^-1 of the row itself, up to length.
		return this.shares(
			kept,
			kept.map((i) => (i === index ? -1 : 0))
		);
	}

	/** Coefficients of the kept constraints' solved rows that minimise 1/2 x'Gx + gradient'x; 0 for the others. */
	private shares(kept: number[], gradient: number[]): number[] {
		const out = new Array<number>(this.constraints.length).fill(0);
		if (kept.length === 0) return out;
		const hessian = kept.map((i) => kept.map((j) => this.gram[i][j]));
		const { x } = solveQuadraticProgram({ hessian, gradient, rows: [], bounds: [], equalities: 0 });
		kept.forEach((i, k) => (out[i] = (this.sign[i] * x[k]) / this.scale[i]));
		return out;
	}

	/** The move itself: -a H^-1 g + sum mu_j H^-1 c_j. */
	assemble(a: number, gradientSolved: Reduced, mu: number[]): Reduced {
		return combine([-a, ...mu], [gradientSolved, ...this.constraints.map((c) => c.solved)]);
	}
}
