import { DualProblem, type LinearConstraint } from './dual';
import { MorphError } from './errors';
import { displacementNorms, mix } from './fields';
import type { MoveSpace } from './space';
import { combine, dot, type Reduced } from './system';

/** What counts as a descent left over by the constraints, relative to the free one (squared lengths in the metric). */
const NO_DESCENT = 1e-18;
const MAX_FITS = 80;
/** A length factor beyond this multiple of the unconstrained one is taken for none. */
const ENDLESS = 1e5;

/** A constraint whose surface field may be at hand, so that a change of multipliers is a sum of fields. */
export interface DescentConstraint extends LinearConstraint {
	/** moved x 3, of H^-1 row; null: formed together with others when needed. */
	field: Float64Array | null;
	/** Whether it bound in the round before. */
	likely?: boolean;
}

/** The weighted gradient in the space. */
export interface Steering {
	row: Reduced;
	solved: Reduced;
	field: Float64Array;
}

/** A move d = -a H^-1 g + sum mu_j H^-1 c_j (+ what was made by hand). */
export interface Fitted {
	a: number;
	mu: number[];
	active: boolean[];
	/** moved x 3, with what was made by hand. */
	displacement: Float64Array;
}

/** One direction under constraints, and the length at which its largest displacement is the step. */
export class Descent {
	readonly dual: DualProblem;
	private readonly fields: (Float64Array | null)[];

	/**
	 * @param places how many of the last constraints are places of the surface
	 * @param hand displacement made by hand, moved x 3, or null
	 */
	constructor(
		private readonly space: MoveSpace,
		private readonly steering: Steering,
		private readonly constraints: DescentConstraint[],
		places: number,
		private readonly hand: Float64Array | null
	) {
		this.dual = new DualProblem(constraints, steering.solved, places);
		this.fields = [steering.field, ...constraints.map((c) => c.field)];
	}

	/** The surface field of coefficients of [H^-1 g, H^-1 c_1, ...]. */
	field(coefficients: number[]): Float64Array {
		const known: number[] = [];
		const formed: number[] = [];
		this.fields.forEach((f, k) => (f ? known : formed).push(k));
		const out = mix(
			known.map((k) => coefficients[k]),
			known.map((k) => this.fields[k] as Float64Array)
		);
		const rest = formed.filter((k) => coefficients[k] !== 0);
		if (rest.length === 0) return out;
		const reduced = combine(
			rest.map((k) => coefficients[k]),
			rest.map((k) => this.constraints[k - 1].solved)
		);
		const added = this.space.field(reduced);
		for (let i = 0; i < out.length; i++) out[i] += added[i];
		return out;
	}

	reduced(coefficients: number[]): Reduced {
		return combine(coefficients, [this.steering.solved, ...this.constraints.map((c) => c.solved)]);
	}

	/** Squared length in the metric. */
	squaredLength(coefficients: number[]): number {
		const rows = combine(coefficients, [this.steering.row, ...this.constraints.map((c) => c.row)]);
		return Math.max(0, dot(this.reduced(coefficients), rows));
	}

	/**
	 * @param step metres
	 * @throws MorphError constraint-conflict, step-unreachable
	 */
	fit(step: number): Fitted {
		if (!this.hand && this.constraints.every((c) => c.change === 0)) return this.proportional(step);
		return this.bounded(step);
	}

	/** With bounds at the present values the move is proportional to its length factor. */
	private proportional(step: number): Fitted {
		const { mu, active } = this.dual.solve(1);
		const displacement = this.field([-1, ...mu]);
		const length = displacementNorms(displacement).max;
		const { row, solved } = this.steering;
		const left = -dot(row, this.dual.assemble(1, solved, mu));
		if (!(left > NO_DESCENT * dot(row, solved)) || !(length > 0)) throw this.stuck();
		const a = step / length;
		for (let i = 0; i < displacement.length; i++) displacement[i] *= a;
		return { a, mu: mu.map((m) => m * a), active, displacement };
	}

	/**
	 * While the same constraints bind, the displacement is F0 + a F1; the length factor at which its largest length is the
	 * step follows vertex by vertex from a quadratic. A change of the binding constraints starts anew, within a bracket.
	 */
	private bounded(step: number): Fitted {
		const unit = displacementNorms(this.steering.field).max;
		const start = step / unit;
		let low = 0;
		let high = Infinity;
		let a = start;
		let before = '';
		let guess = this.constraints.map((c) => c.likely ?? false);
		for (let k = 0; k < MAX_FITS; k++) {
			const { active } = this.dual.solve(a, guess);
			guess = active;
			const { base, slope } = this.dual.line(active);
			const f0 = this.field([0, ...base]);
			const f1 = this.field([-1, ...slope]);
			// Beyond the endless factor F1 is rounding alone: nothing can be reached by it.
			const found = lengthFactor(f0, f1, step);
			const reach = found !== null && found <= ENDLESS * start ? found : null;
			const key = active.map(Number).join('');
			const length = longest(f0, f1, a);
			if (
				reach !== null &&
				reach > 0 &&
				(reach === a || (key === before && close(reach, a)) || this.same(active, reach))
			) {
				return this.result(reach, active, f0, f1);
			}
			before = key;
			if (length < step) low = Math.max(low, a);
			else high = Math.min(high, a);
			if (high <= low * (1 + 1e-14)) return this.result(a, active, f0, f1);
			if (high === Infinity && low > ENDLESS * start) throw this.unreachable(length, step, active);
			if (low === 0 && high < 1e-12 * start) throw this.asksTooMuch(step);
			const proposal = reach !== null && reach > low && reach < high && k % 4 !== 3 ? reach : null;
			a = proposal ?? (high === Infinity ? 8 * a : low === 0 ? high / 8 : 0.5 * (low + high));
		}
		throw this.asksTooMuch(step);
	}

	private same(active: boolean[], a: number): boolean {
		const other = this.dual.solve(a, active).active;
		return active.every((on, i) => on === other[i]);
	}

	private result(a: number, active: boolean[], f0: Float64Array, f1: Float64Array): Fitted {
		const { base, slope } = this.dual.line(active);
		const displacement = f0;
		for (let i = 0; i < displacement.length; i++) displacement[i] += a * f1[i];
		if (this.hand) for (let i = 0; i < displacement.length; i++) displacement[i] += this.hand[i];
		return { a, mu: base.map((b, j) => b + a * slope[j]), active, displacement };
	}

	private names(active?: boolean[]): string {
		const labels = this.constraints.filter((_, i) => !active || active[i]).map((c) => c.label);
		return [...new Set(labels)].map((l) => `"${l}"`).join(', ');
	}

	private stuck(): MorphError {
		return new MorphError(
			'constraint-conflict',
			'The constraints leave no direction in which the weighted objective falls.',
			'Relax a constraint, free more control points, or weight another objective.'
		);
	}

	private unreachable(length: number, step: number, active: boolean[]): MorphError {
		return new MorphError(
			'step-unreachable',
			`The step of ${step} m cannot be reached: with ${this.names(active)} kept, no vertex can gain by moving more than ` +
				`${length.toPrecision(4)} m.`,
			`Take a step below ${length.toPrecision(3)} m, relax the constraint, or free more control points.`
		);
	}

	private asksTooMuch(step: number): MorphError {
		const { mu } = this.dual.solve(0);
		const asked = displacementNorms(this.field([0, ...mu])).max;
		return new MorphError(
			'constraint-conflict',
			`The bounds of ${this.names()} ask for a displacement of ${asked.toPrecision(4)} m; the step is ${step} m.`,
			'Give a longer step, or bounds nearer to the present values.'
		);
	}
}

const close = (a: number, b: number) => Math.abs(a - b) <= 1e-13 * Math.abs(a);

/** Largest length of F0 + a F1. */
function longest(f0: Float64Array, f1: Float64Array, a: number): number {
	let max = 0;
	for (let i = 0; i < f0.length; i += 3) {
		const s = (f0[i] + a * f1[i]) ** 2 + (f0[i + 1] + a * f1[i + 1]) ** 2 + (f0[i + 2] + a * f1[i + 2]) ** 2;
		if (s > max) max = s;
	}
	return Math.sqrt(max);
}

/** The largest a up to which no |F0 + a F1| exceeds the step (a convex function of a); null when there is none. */
function lengthFactor(f0: Float64Array, f1: Float64Array, step: number): number | null {
	let from = -Infinity;
	let to = Infinity;
	for (let i = 0; i < f0.length; i += 3) {
		const q = f1[i] ** 2 + f1[i + 1] ** 2 + f1[i + 2] ** 2;
		const p = f0[i] * f1[i] + f0[i + 1] * f1[i + 1] + f0[i + 2] * f1[i + 2];
		const c = f0[i] ** 2 + f0[i + 1] ** 2 + f0[i + 2] ** 2 - step * step;
		const inside = p * p - q * c;
		if (q === 0) {
			if (c > 0) return null;
			continue;
		}
		if (inside < 0) return null;
		const root = Math.sqrt(inside);
		// The root without cancellation, then its partner by their product c / q.
		const near = p > 0 ? -(p + root) / q : (root - p) / q;
		const other = near === 0 ? 0 : c / (q * near);
		from = Math.max(from, Math.min(near, other));
		to = Math.min(to, Math.max(near, other));
	}
	return to >= from && to < Infinity ? to : null;
}
