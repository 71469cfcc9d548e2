import { checkBox } from './box';
import { Descent, type DescentConstraint, type Fitted, type Steering } from './descent';
import { MorphError } from './errors';
import { GradientCache, along, checkObjectives, displacementNorms, mix } from './fields';
import { handLattices } from './hand';
import { linearPart, type EnclosedVolume, type LinearPart } from './linear-constraints';
import { BoxOperator } from './operator';
import { patchVolume } from './part-volume';
import { PlaceRounds, placeSets, type PlaceSet } from './places';
import { reports } from './reports';
import { LatticeSpace, emptyBox, lockedBox, type MoveSpace } from './space';
import { applyDisplacement } from './store';
import { boundsCentre } from './surface';
import { SurfaceSpace } from './surface-space';
import { onPlane, planeNormal, tieBoxes, type Tie } from './symmetry';
import { ReducedSystem, combine, dot } from './system';
import type {
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
/** An inequality on the volume is restored when the curved surface breaks it by more than this share. */
const VOLUME_SLACK = 1e-13;
/** Passes over several held volumes. */
const VOLUME_PASSES = 4;
const MAX_ROUNDS = 60;
/** Rounds without a smaller violation after which the constraints are taken to be in conflict. */
const STALLED_ROUNDS = 12;

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
	const { smoothing, eps = DEFAULT_EPS, weights, symmetry, path = 'auto', checkpoint } = options;
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
	const tied = symmetry ? tieBoxes(boxes, symmetry) : null;
	const plane = symmetry
		? {
				plane: symmetry,
				positions: surface.positions,
				flags: onPlane(surface.positions, symmetry),
				normal: planeNormal(symmetry)
			}
		: null;
	if (options.mode === 'surface') {
		const space = new SurfaceSpace(surface, tied?.boxes ?? boxes, boxes.length, smoothing, weights, plane);
		checkpoint?.(1);
		return new Move(surface, boxes, space, space.insideCounts.slice(0, boxes.length), null);
	}
	const operators: BoxOperator[] = [];
	const standing: number[] = [];
	(tied?.boxes ?? boxes).forEach((box, b) => {
		const op = new BoxOperator(box, surface, weights, path);
		// A half model has nothing in the mirror images of its boxes.
		if (op.inside.length === 0 && b >= boxes.length) return;
		if (op.inside.length === 0) throw emptyBox(box);
		if (weights && !op.inside.some((v) => weights[v] > 0)) throw lockedBox(box);
		standing.push(b);
		operators.push(op);
	});
	checkpoint?.(0.1);
	const ties = tied && {
		normal: tied.normal,
		list: tied.ties.map((tie): Tie => ({ ...tie, image: standing.indexOf(tie.image) }))
	};
	const report = checkpoint && ((f: number) => checkpoint(0.1 + 0.9 * f));
	const system = new ReducedSystem(operators, surface, smoothing, eps, ties, report);
	const space = new LatticeSpace(operators, system, n, plane);
	const inside = operators.map((op) => op.inside.length);
	return new Move(
		surface,
		operators.map((op) => op.box),
		space,
		inside,
		{
			given: boxes.length,
			operators,
			ties,
			space
		}
	);
}

/** What a move by control points has besides its space. */
interface Lattices {
	given: number;
	operators: BoxOperator[];
	ties: { list: Tie[]; normal: [number, number, number] } | null;
	space: LatticeSpace;
}

class Move implements PreparedMove {
	readonly moved: Uint32Array;
	readonly freePoints: readonly number[];
	readonly unknowns: number;
	readonly path: 'direct' | 'moments';
	private readonly gradients: GradientCache;
	private volumes: VolumeChange | null = null;
	private readonly parts = new WeakMap<Uint32Array, EnclosedVolume>();

	/** @param lattices null in surface mode */
	constructor(
		private readonly surface: Surface,
		readonly boxes: readonly DesignBox[],
		private readonly space: MoveSpace,
		readonly insideCounts: readonly number[],
		private readonly lattices: Lattices | null
	) {
		this.moved = space.moved;
		this.freePoints = lattices?.operators.map((op) => op.free.length) ?? boxes.map(() => 0);
		this.unknowns = space.unknowns;
		this.path = lattices?.operators.some((op) => op.path === 'moments') ? 'moments' : 'direct';
		this.gradients = new GradientCache(space);
	}

	/** The whole body's volume, or that of a part bounded by some triangles; kept by the identity of the list. */
	private volumeOf(part: Uint32Array | undefined): EnclosedVolume {
		const { surface } = this;
		if (!part) return { before: surface.volume, gradient: surface.volumeGradient, change: this.volumeChange };
		let known = this.parts.get(part);
		if (!known) {
			const { positions, triangles, volume, gradient } = patchVolume(surface.positions, surface.triangles, part);
			const closed = { positions, triangles, origin: boundsCentre(positions) };
			known = { before: volume, gradient, change: new VolumeChange(closed, this.moved) };
			this.parts.set(part, known);
		}
		return known;
	}

	/** The control points' displacements made by hand, images filled in. */
	private byHand(hand: (Float64Array | null)[]): { lattices: Float64Array[]; field: Float64Array } {
		if (!this.lattices) {
			throw new MorphError(
				'hand-invalid',
				'In surface mode there are no control points to move by hand.',
				'Choose the mode lattice, or leave the hand-made displacement out.'
			);
		}
		const { given, operators, ties, space } = this.lattices;
		const lattices = handLattices(hand, given, operators, ties);
		return { lattices, field: space.ofLattices(lattices) };
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
		const steering = this.steering(objectives);
		checkpoint?.(0.4);
		const byHand = request.hand ? this.byHand(request.hand) : null;
		const hand = byHand?.field ?? null;
		const linear = this.linearParts(constraints, objectives);
		const sets = this.placeSets(constraints, step + (hand ? displacementNorms(hand).max : 0));
		checkpoint?.(0.5);
		const { fitted, coefficients, descent, rounds } = this.descend(steering, linear, sets, hand, step, checkpoint);
		checkpoint?.(0.9);
		const lattices = this.space.lattices(descent.reduced(coefficients));
		byHand?.lattices.forEach((lattice, b) => lattice.forEach((x, i) => (lattices[b][i] += x)));
		const { displacement, a } = fitted;
		const prices = this.prices(fitted, linear, sets, rounds);
		checkpoint?.(1);
		return {
			...this.outcome(displacement, objectives, linear, sets, prices),
			lattices,
			metricLength: Math.sqrt(descent.squaredLength(coefficients)),
			stepFactor: a
		};
	}

	/** The weighted gradient of the objectives that steer. */
	private steering(objectives: MoveObjective[]): Steering {
		const steering = objectives.filter((o) => direction(o) !== 0);
		if (steering.length === 0) {
			throw new MorphError(
				'gradient-missing',
				'No objective steers the move: each is held or has the weight 0.',
				'Give at least one objective with a map, a weight above 0 and the sense minimise or maximise.'
			);
		}
		const prepared = steering.map((o) => this.gradients.get(o.gradient));
		const factors = steering.map(direction);
		const row = combine(
			factors,
			prepared.map((p) => p.row)
		);
		const solved = combine(
			factors,
			prepared.map((p) => p.solved)
		);
		if (!(dot(row, solved) > 0)) {
			throw new MorphError(
				'gradient-zero',
				'The maps of the weighted objectives are zero on everything that may move.',
				'Place a design box where the map is not zero, or check the map and its sign.'
			);
		}
		return {
			row,
			solved,
			field: mix(
				factors,
				prepared.map((p) => p.field)
			)
		};
	}

	private linearParts(constraints: MoveConstraint[], objectives: MoveObjective[]): LinearPart[] {
		return constraints.flatMap((c, index) => {
			if (c.kind === 'volume' || c.kind === 'objective') {
				return [linearPart(c, index, this.surface, this.gradients, objectives, (part) => this.volumeOf(part))];
			}
			if (c.kind === 'displacement' || c.kind === 'keepOut' || c.kind === 'thickness') return [];
			throw new MorphError(
				'unsupported',
				`Constraints of the kind "${String((c as { kind: unknown }).kind)}" are not available.`,
				'Use the kinds volume, objective, displacement, keepOut and thickness.',
				{ constraint: index }
			);
		});
	}

	private placeSets(constraints: MoveConstraint[], reach: number): PlaceSet[] {
		return constraints.flatMap((c, index) =>
			c.kind === 'volume' || c.kind === 'objective' ? [] : placeSets(c, index, this.surface, this.moved, reach)
		);
	}

	/**
	 * The move for the linear constraints; then, in rounds, for those of the places that it breaks, each linearised where
	 * the surface has come to.
	 */
	private descend(
		steering: Steering,
		linear: LinearPart[],
		sets: PlaceSet[],
		hand: Float64Array | null,
		step: number,
		checkpoint: MoveRequest['checkpoint']
	): { fitted: Fitted; coefficients: number[]; descent: Descent; rounds: PlaceRounds | null } {
		const rounds = sets.length > 0 ? new PlaceRounds(this.space, this.surface, sets, step) : null;
		const base = linear.map(({ constraint, prepared, gradient, change, label }): DescentConstraint => ({
			...prepared,
			bound: constraint.bound,
			change: hand ? change - along(gradient, this.moved, hand) : change,
			label
		}));
		let best = Infinity;
		let stalled = 0;
		for (let round = 0; ; round++) {
			const placed = rounds?.rows ?? [];
			const descent = new Descent(this.space, steering, [...base, ...placed], placed.length, hand);
			const fitted = descent.fit(step);
			const coefficients = [-fitted.a, ...fitted.mu];
			this.restoreVolume(linear, descent, fitted, coefficients);
			if (!rounds) return { fitted, coefficients, descent, rounds };
			const positions = applyDisplacement(this.surface.positions, this.moved, fitted.displacement);
			const computed = hand ? mix([1, -1], [fitted.displacement, hand]) : fitted.displacement;
			const { worst, labels } = rounds.next(positions, computed, fitted.active.slice(base.length));
			if (worst === 0) return { fitted, coefficients, descent, rounds };
			// The next round's linear volume takes in how this one's surface curves, so that restoring it moves nothing much.
			linear.forEach(({ volume, gradient, change }, i) => {
				if (!volume) return;
				const curved = volume.change.cubic(fitted.displacement, null)[0];
				base[i].change = change - curved + along(gradient, this.moved, computed);
			});
			if (worst < 0.7 * best) {
				best = worst;
				stalled = 0;
			} else stalled++;
			if (stalled > STALLED_ROUNDS || round === MAX_ROUNDS) throw this.conflict(labels, descent, fitted, worst);
			checkpoint?.(0.5 + 0.4 * (1 - 1 / (2 + round)));
		}
	}

	private conflict(broken: string[], descent: Descent, { active }: Fitted, worst: number): MorphError {
		const with_ = descent.dual.constraints.filter((c, i) => active[i] && !broken.includes(c.label)).map((c) => c.label);
		const quoted = (labels: string[]) => [...new Set(labels)].map((l) => `"${l}"`).join(', ');
		return new MorphError(
			'constraint-conflict',
			`No move keeps all constraints: ${quoted(broken)} would still be broken by ${worst.toPrecision(3)} m` +
				(with_.length > 0 ? ` where ${quoted(with_)} must be kept.` : ' where the boxes let the surface move.'),
			'Relax or remove one of these constraints, take a shorter step, or free more control points.'
		);
	}

	/**
	 * Brings the volume of the curved surface to its bound exactly, along the shortest correction in the metric that
	 * leaves the other active constraints alone. Changes displacement, coefficients and active in place.
	 */
	private restoreVolume(linear: LinearPart[], descent: Descent, fitted: Fitted, coefficients: number[]): void {
		const { displacement, active } = fitted;
		const volumes = linear.map((part, i) => ({ ...part, i })).filter(({ volume }) => volume);
		// A correction of one leaves the others alone to first order only: several settle in a few passes.
		for (let pass = 0; pass < (volumes.length > 1 ? VOLUME_PASSES : 1); pass++) {
			for (const { constraint, index, limit, volume, i } of volumes) {
				const { change, before } = volume as EnclosedVolume;
				const target = limit - before;
				if (!active[i]) {
					const [now] = change.cubic(displacement, null);
					const slack = VOLUME_SLACK * Math.abs(before);
					if (constraint.bound === 'atLeast' ? now >= target - slack : now <= target + slack) continue;
					active[i] = true;
				}
				const shares = descent.dual.correction(i, active);
				const correction = descent.field([0, ...shares]);
				const t = nearRoot(change.cubic(displacement, correction), target);
				if (t === null || Math.abs(t) * displacementNorms(correction).max > displacementNorms(displacement).max) {
					throw new MorphError(
						'constraint-conflict',
						'The volume cannot be restored after the move.',
						'Take a shorter step.',
						{ constraint: index }
					);
				}
				for (let k = 0; k < displacement.length; k++) displacement[k] += t * correction[k];
				shares.forEach((s, k) => (coefficients[k + 1] += t * s));
			}
		}
	}

	/** By report key: whether it binds, its price, and at how many places. */
	private prices({ a, mu, active }: Fitted, linear: LinearPart[], sets: PlaceSet[], rounds: PlaceRounds | null) {
		// mu enters as +mu H^-1 c, so the optimum falls by mu / a per unit by which the bound sinks (atLeast: relaxed).
		const ofLinear = linear.map(({ constraint }, i) => ({
			active: active[i],
			price: active[i] ? (constraint.bound === 'atLeast' ? mu[i] : -mu[i]) / a : 0,
			places: 0
		}));
		const ofSets = sets.map((set) => {
			let price = 0;
			let places = 0;
			rounds?.binding.forEach((row, k) => {
				const i = linear.length + k;
				if (row.set !== set || !active[i]) return;
				price += mu[i] / a;
				places++;
			});
			return { active: places > 0, price, places };
		});
		return { linear: ofLinear, sets: ofSets };
	}

	/** What is said of any displacement. */
	private outcome(
		displacement: Float64Array,
		objectives: MoveObjective[],
		linear: LinearPart[],
		sets: PlaceSet[],
		prices: ReturnType<Move['prices']> | null
	) {
		const { max, rms } = displacementNorms(displacement);
		const predicted = objectives.map((o) => ({
			objectiveId: o.id,
			change: along(o.gradient, this.moved, displacement)
		}));
		const volumeBefore = this.surface.volume;
		const volumeAfter = volumeBefore + this.volumeChange.cubic(displacement, null)[0];
		return {
			moved: this.moved,
			partners: this.space.partners,
			displacement,
			predicted,
			predictedWeighted: objectives.reduce((sum, o, i) => sum + direction(o) * predicted[i].change, 0),
			maxDisplacement: max,
			rmsDisplacement: rms,
			volumeBefore,
			volumeAfter,
			constraints: reports({
				surface: this.surface,
				moved: this.moved,
				displacement,
				linear,
				sets,
				predicted,
				prices
			})
		};
	}

	applyByHand(
		lattices: (Float64Array | null)[],
		objectives: MoveObjective[],
		constraints: MoveConstraint[] = []
	): HandMove {
		checkObjectives(objectives, this.surface);
		const byHand = this.byHand(lattices);
		const displacement = byHand.field;
		const linear = this.linearParts(constraints, objectives);
		const sets = this.placeSets(constraints, displacementNorms(displacement).max);
		return { ...this.outcome(displacement, objectives, linear, sets, null), lattices: byHand.lattices };
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
