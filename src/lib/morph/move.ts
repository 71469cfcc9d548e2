import { checkBox } from './box';
import { DualProblem, type DualSolution, type LinearConstraint } from './dual';
import { MorphError } from './errors';
import { GradientCache, MovedSet, checkObjectives, type Prepared } from './fields';
import { BoxOperator } from './operator';
import { ReducedSystem, combine, dot, type Reduced } from './system';
import type {
	ConstraintReport,
	DesignBox,
	HandMove,
	MoveConstraint,
	MoveObjective,
	MoveRequest,
	MoveSolution,
	PreparedMove,
	PrepareOptions,
	Surface
} from './types';
import { VolumeChange, nearRoot } from './volume-change';

const DEFAULT_EPS = 1e-6;
/** What counts as a descent left over by the constraints, relative to the free one (squared lengths in the metric). */
const NO_DESCENT = 1e-18;
const STEP_TOLERANCE = 1e-12;
const MAX_STEP_ROUNDS = 200;
/** An inequality on the volume is restored when the curved surface breaks it by more than this share. */
const VOLUME_SLACK = 1e-13;

/** Largest and root mean square length of n vectors. */
export function displacementNorms(displacement: Float64Array): { max: number; rms: number } {
	let max = 0;
	let sum = 0;
	for (let i = 0; i < displacement.length; i += 3) {
		const s = displacement[i] ** 2 + displacement[i + 1] ** 2 + displacement[i + 2] ** 2;
		sum += s;
		if (s > max) max = s;
	}
	const n = displacement.length / 3;
	return { max: Math.sqrt(max), rms: n > 0 ? Math.sqrt(sum / n) : 0 };
}

function mix(factors: number[], fields: Float64Array[]): Float64Array {
	const out = new Float64Array(fields[0].length);
	for (let k = 0; k < fields.length; k++) {
		const f = factors[k];
		if (f === 0) continue;
		const field = fields[k];
		for (let i = 0; i < out.length; i++) out[i] += f * field[i];
	}
	return out;
}

const direction = (o: MoveObjective) => (o.sense === 'minimise' ? o.weight : o.sense === 'maximise' ? -o.weight : 0);

/**
 * Embeds the boxes, forms and factors the metric. Everything that a change of weights, step or constraints leaves as it
 * is stays in the returned object; gradients are kept by the identity of their arrays, so pass a new array for new
 * values.
 *
 * @param surface in metres, from makeSurface; borrowed and kept
 * @param boxes at least one
 * @throws MorphError box-invalid, box-empty, no-free-points, smoothing-invalid, metric-singular
 */
export function prepareMove(surface: Surface, boxes: DesignBox[], options: PrepareOptions): PreparedMove {
	const { smoothing, eps = DEFAULT_EPS, weights, path = 'auto', checkpoint } = options;
	if (!Number.isFinite(smoothing) || smoothing < 0) {
		throw new MorphError(
			'smoothing-invalid',
			`The smoothing length ${smoothing} is no length.`,
			'Give 0 or more metres.'
		);
	}
	if (!Number.isFinite(eps) || eps < 0) {
		throw new MorphError('smoothing-invalid', `The regularisation ${eps} is not usable.`, 'Give eps of 0 or more.');
	}
	if (boxes.length === 0) {
		throw new MorphError('box-empty', 'The move names no design box.', 'Choose at least one design box.');
	}
	const n = surface.positions.length / 3;
	if (weights && (weights.length !== n || weights.some((w) => !(w >= 0 && w <= 1)))) {
		throw new MorphError('mesh-shape', 'The vertex weights do not fit the surface.', 'Give N weights in [0, 1].');
	}
	boxes.forEach(checkBox);
	const operators = boxes.map((box) => {
		const op = new BoxOperator(box, surface, weights, path);
		if (op.inside.length === 0) {
			const label = box.name ?? box.id;
			throw new MorphError(
				'box-empty',
				`Design box "${label}" holds no vertex of the surface.`,
				'Move or enlarge the box until it meets the surface.',
				{ box: label }
			);
		}
		return op;
	});
	checkpoint?.(0.1);
	const moved = new MovedSet(operators, n);
	const system = new ReducedSystem(
		operators,
		surface,
		smoothing,
		eps,
		checkpoint && ((f) => checkpoint(0.1 + 0.9 * f))
	);
	return new LatticeMove(surface, boxes, operators, moved, system);
}

class LatticeMove implements PreparedMove {
	readonly moved: Uint32Array;
	readonly insideCounts: readonly number[];
	readonly freePoints: readonly number[];
	readonly unknowns: number;
	readonly path: 'direct' | 'moments';
	private readonly gradients: GradientCache;
	private volumes: VolumeChange | null = null;

	constructor(
		private readonly surface: Surface,
		readonly boxes: readonly DesignBox[],
		operators: BoxOperator[],
		private readonly set: MovedSet,
		private readonly system: ReducedSystem
	) {
		this.moved = set.ids;
		this.insideCounts = operators.map((op) => op.inside.length);
		this.freePoints = operators.map((op) => op.free.length);
		this.unknowns = system.unknowns;
		this.path = operators.every((op) => op.path === 'direct') ? 'direct' : 'moments';
		this.gradients = new GradientCache(operators, set, system);
	}

	private get volumeChange(): VolumeChange {
		this.volumes ??= new VolumeChange(this.surface, this.moved);
		return this.volumes;
	}

	solve(request: MoveRequest): MoveSolution {
		const { objectives, step, constraints, checkpoint } = request;
		if (!Number.isFinite(step) || step <= 0) {
			throw new MorphError('step-invalid', `The step ${step} is no length.`, 'Give a step of more than 0 metres.');
		}
		checkObjectives(objectives, this.surface);
		const steering = objectives.filter((o) => direction(o) !== 0);
		if (steering.length === 0) {
			throw new MorphError(
				'gradient-missing',
				'No objective steers the move: each is held or has the weight 0.',
				'Give at least one objective with a map, a weight above 0 and the sense minimise or maximise.'
			);
		}
		const prepared = steering.map((o) => this.gradients.get(o.gradient));
		checkpoint?.(0.4);
		const factors = steering.map(direction);
		const row = combine(
			factors,
			prepared.map((p) => p.row)
		);
		const solved = combine(
			factors,
			prepared.map((p) => p.solved)
		);
		const free = dot(row, solved);
		if (!(free > 0)) {
			throw new MorphError(
				'gradient-zero',
				'The maps of the weighted objectives are zero on everything that may move.',
				'Place a design box where the map is not zero, or check the map and its sign.'
			);
		}
		const linear = constraints.map((c, i) => this.linear(c, i, objectives));
		const dual = new DualProblem(
			linear.map((l) => l.constraint),
			solved
		);
		const fields = [
			mix(
				factors,
				prepared.map((p) => p.field)
			),
			...linear.map((l) => l.prepared.field)
		];
		checkpoint?.(0.6);
		const { a, solution, displacement } = this.fitStep(dual, fields, step, solved, row, free);
		checkpoint?.(0.7);
		const coefficients = [-a, ...solution.mu];
		const active = solution.active.slice();
		const volumeAfter = this.restoreVolume(constraints, linear, dual, active, coefficients, fields, displacement);
		checkpoint?.(0.9);
		const parts = [solved, ...linear.map((l) => l.prepared.solved)];
		const reduced = combine(coefficients, parts);
		const lattices = this.system.expand(reduced);
		const metric = dot(reduced, combine(coefficients, [row, ...linear.map((l) => l.prepared.row)]));
		const { max, rms } = displacementNorms(displacement);
		const predicted = objectives.map((o) => ({
			objectiveId: o.id,
			change: this.set.along(o.gradient, displacement)
		}));
		const reports = constraints.map((c, i) =>
			this.report(c, linear[i].limit, predicted, volumeAfter, active[i], solution.mu[i] / a)
		);
		checkpoint?.(1);
		return {
			lattices,
			moved: this.moved,
			displacement,
			predicted,
			predictedWeighted: objectives.reduce((sum, o, i) => sum + direction(o) * predicted[i].change, 0),
			maxDisplacement: max,
			rmsDisplacement: rms,
			volumeBefore: this.surface.volume,
			volumeAfter,
			constraints: reports,
			metricLength: Math.sqrt(Math.max(0, metric)),
			stepFactor: a
		};
	}

	/** The constraint as a linear one on the displacement, and its bound in its own unit. */
	private linear(
		constraint: MoveConstraint,
		index: number,
		objectives: MoveObjective[]
	): { constraint: LinearConstraint; prepared: Prepared; limit: number } {
		const { bound, value } = constraint;
		if (value !== undefined && !Number.isFinite(value)) {
			throw new MorphError('constraint-invalid', `The bound ${value} is no number.`, 'Give a finite bound.', {
				constraint: index
			});
		}
		if (bound !== 'hold' && bound !== 'atLeast' && bound !== 'atMost') {
			throw new MorphError(
				'constraint-invalid',
				`The bound "${String(bound)}" is unknown.`,
				'Give hold, atLeast or atMost.',
				{
					constraint: index
				}
			);
		}
		if (constraint.kind === 'volume') {
			if (!this.surface.watertight) {
				throw new MorphError(
					'mesh-open',
					'The surface is open, so it encloses no volume that a move could keep.',
					'Close the surface, or remove the volume constraint.',
					{ constraint: index }
				);
			}
			const prepared = this.gradients.get(this.surface.volumeGradient);
			const limit = value ?? this.surface.volume;
			const change = limit - this.surface.volume;
			return {
				prepared,
				limit,
				constraint: { row: prepared.row, solved: prepared.solved, bound, change, label: 'volume' }
			};
		}
		if (constraint.kind !== 'objective') {
			throw new MorphError(
				'unsupported',
				`Constraints of the kind "${String((constraint as { kind: unknown }).kind)}" are not available.`,
				'Use the kinds volume and objective.',
				{ constraint: index }
			);
		}
		const objective = objectives.find((o) => o.id === constraint.objectiveId);
		if (!objective) {
			throw new MorphError(
				'gradient-missing',
				`The constrained objective "${constraint.objectiveId}" has no map.`,
				'Upload its map for this shape, or remove the constraint.',
				{ constraint: index, objective: constraint.objectiveId }
			);
		}
		const prepared = this.gradients.get(objective.gradient);
		const limit = value ?? 0;
		return {
			prepared,
			limit,
			constraint: {
				row: prepared.row,
				solved: prepared.solved,
				bound,
				change: limit,
				label: `objective ${objective.id}`
			}
		};
	}

	/** The length factor for which the largest displacement is the step. */
	private fitStep(
		dual: DualProblem,
		fields: Float64Array[],
		step: number,
		solved: Reduced,
		row: Reduced,
		free: number
	): { a: number; solution: DualSolution; displacement: Float64Array } {
		const at = (a: number) => {
			const solution = dual.solve(a);
			const displacement = mix([-a, ...solution.mu], fields);
			return { a, solution, displacement, length: displacementNorms(displacement).max };
		};
		const stuck = () =>
			new MorphError(
				'constraint-conflict',
				'The constraints leave no direction in which the weighted objective falls.',
				'Relax a constraint, free more control points, or weight another objective.'
			);
		if (dual.constraints.every((c) => c.change === 0)) {
			const unit = at(1);
			const left = -dot(row, dual.assemble(1, solved, unit.solution.mu));
			if (!(left > NO_DESCENT * free) || !(unit.length > 0)) throw stuck();
			const a = step / unit.length;
			const displacement = unit.displacement;
			for (let i = 0; i < displacement.length; i++) displacement[i] *= a;
			return { a, displacement, solution: { mu: unit.solution.mu.map((m) => m * a), active: unit.solution.active } };
		}
		// With bounds away from the present values the move is not proportional to a: first what the bounds alone ask.
		let low = at(0);
		if (low.length > step) {
			throw new MorphError(
				'constraint-conflict',
				`The bounds of ${dual.constraints.map((c) => `"${c.label}"`).join(', ')} ask for a displacement of ` +
					`${low.length.toPrecision(4)} m; the step is ${step} m.`,
				'Give a longer step, or bounds nearer to the present values.'
			);
		}
		let high = at(step / displacementNorms(fields[0]).max);
		for (let k = 0; high.length < step; k++) {
			if (k === 200) throw stuck();
			low = high;
			high = at(2 * high.a);
		}
		// Bisection with a secant proposal; the largest displacement is continuous and grows in the end.
		let best = high;
		for (let k = 0; k < MAX_STEP_ROUNDS && Math.abs(best.length - step) > STEP_TOLERANCE * step; k++) {
			const secant = low.a + ((high.a - low.a) * (step - low.length)) / (high.length - low.length);
			const inside = secant > low.a && secant < high.a && k % 3 !== 2;
			const a = inside ? secant : 0.5 * (low.a + high.a);
			if (!(a > low.a && a < high.a)) break;
			best = at(a);
			if (best.length < step) low = best;
			else high = best;
		}
		return best;
	}

	/**
	 * Brings the volume of the curved surface to its bound exactly, along the shortest correction in the metric that
	 * leaves the other active constraints alone. Changes displacement, coefficients and active in place; returns the
	 * volume.
	 */
	private restoreVolume(
		constraints: MoveConstraint[],
		linear: { prepared: Prepared; limit: number }[],
		dual: DualProblem,
		active: boolean[],
		coefficients: number[],
		fields: Float64Array[],
		displacement: Float64Array
	): number {
		const before = this.surface.volume;
		if (!this.surface.watertight) return before + this.volumeChange.cubic(displacement, null)[0];
		let after: number | null = null;
		for (let i = 0; i < constraints.length; i++) {
			if (constraints[i].kind !== 'volume') continue;
			const { bound } = constraints[i];
			const target = linear[i].limit - before;
			if (!active[i]) {
				const [change] = this.volumeChange.cubic(displacement, null);
				after = before + change;
				const slack = VOLUME_SLACK * Math.abs(before);
				if (bound === 'atLeast' ? change >= target - slack : change <= target + slack) continue;
				active[i] = true;
			}
			const shares = dual.correction(i, active);
			const correction = mix([0, ...shares], fields);
			const cubic = this.volumeChange.cubic(displacement, correction);
			const t = nearRoot(cubic, target);
			if (t === null || Math.abs(t) * displacementNorms(correction).max > displacementNorms(displacement).max) {
				throw new MorphError(
					'constraint-conflict',
					'The volume cannot be restored after the move.',
					'Take a shorter step.',
					{ constraint: i }
				);
			}
			for (let k = 0; k < displacement.length; k++) displacement[k] += t * correction[k];
			shares.forEach((s, k) => (coefficients[k + 1] += t * s));
			after = before + cubic[0] + t * (cubic[1] + t * (cubic[2] + t * cubic[3]));
		}
		return after ?? before + this.volumeChange.cubic(displacement, null)[0];
	}

	private report(
		constraint: MoveConstraint,
		limit: number,
		predicted: { objectiveId: string; change: number }[],
		volumeAfter: number,
		active: boolean,
		multiplier: number
	): ConstraintReport {
		const { kind, bound } = constraint;
		// mu enters as +mu H^-1 c, so the optimum falls by mu / a per unit by which the bound sinks (atLeast: relaxed).
		const price = active ? (bound === 'atLeast' ? multiplier : -multiplier) : 0;
		if (constraint.kind === 'volume') {
			return { kind, bound, limit, before: this.surface.volume, after: volumeAfter, active, price };
		}
		const after = predicted.find((p) => p.objectiveId === constraint.objectiveId)?.change ?? 0;
		return { kind, objectiveId: constraint.objectiveId, bound, limit, before: 0, after, active, price };
	}

	applyByHand(lattices: Float64Array[], objectives: MoveObjective[]): HandMove {
		checkObjectives(objectives, this.surface);
		this.boxes.forEach((box, b) => {
			const size = 3 * box.lattice[0] * box.lattice[1] * box.lattice[2];
			if (lattices.length !== this.boxes.length || lattices[b].length !== size || !lattices[b].every(Number.isFinite)) {
				throw new MorphError(
					'box-invalid',
					`The displacement of design box "${box.name ?? box.id}" does not fit its lattice.`,
					'Give three finite numbers per control point, for every box.',
					{ box: box.name ?? box.id }
				);
			}
		});
		const displacement = this.set.evaluate(lattices);
		const { max, rms } = displacementNorms(displacement);
		return {
			moved: this.moved,
			displacement,
			predicted: objectives.map((o) => ({ objectiveId: o.id, change: this.set.along(o.gradient, displacement) })),
			maxDisplacement: max,
			rmsDisplacement: rms,
			volumeBefore: this.surface.volume,
			volumeAfter: this.surface.volume + this.volumeChange.cubic(displacement, null)[0]
		};
	}
}

/** prepareMove and solve in one go, for a single move. */
export function computeMove(
	surface: Surface,
	boxes: DesignBox[],
	options: PrepareOptions,
	request: MoveRequest
): MoveSolution {
	return prepareMove(surface, boxes, options).solve(request);
}
