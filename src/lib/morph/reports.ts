import type { LinearPart } from './linear-constraints';
import { worstPlace, type PlaceSet } from './places';
import { applyDisplacement } from './store';
import type { Bound, ConstraintReport, MoveConstraint, Surface } from './types';

/** What an equality or a bound may be off by, relative to the volume, and to the largest change of an objective. */
const VOLUME_KEPT = 1e-9;
const OBJECTIVE_KEPT = 1e-9;
/** Metres by which a place may lie beyond its limit, relative to the surface's extent: rounding only. */
const PLACE_KEPT = 1e-9;

interface Price {
	active: boolean;
	price: number;
	places: number;
}

const keeps = (value: number, bound: Bound, limit: number, tolerance: number) =>
	(bound !== 'atMost' ? value >= limit - tolerance : true) && (bound !== 'atLeast' ? value <= limit + tolerance : true);

/** Each constraint's value before and after a displacement, whether it is kept, and its price where it binds. */
export function reports(input: {
	surface: Surface;
	moved: Uint32Array;
	displacement: Float64Array;
	linear: LinearPart[];
	sets: PlaceSet[];
	predicted: { objectiveId: string; change: number }[];
	/** null: a move by hand alone, where nothing binds. */
	prices: { linear: Price[]; sets: Price[] } | null;
}): ConstraintReport[] {
	const { surface, linear, sets, predicted, prices } = input;
	const none: Price = { active: false, price: 0, places: 0 };
	const largest = Math.max(...predicted.map((p) => Math.abs(p.change)));
	const ofLinear = linear.map(({ constraint, index, limit, volume }, i): ConstraintReport => {
		const { kind, bound } = constraint;
		const { active, price } = prices?.linear[i] ?? none;
		if (volume) {
			const { before } = volume;
			const after = before + volume.change.cubic(input.displacement, null)[0];
			const kept = keeps(after, bound, limit, VOLUME_KEPT * Math.abs(limit));
			return { index, kind, bound, limit, before, after, kept, active, price };
		}
		const { objectiveId } = constraint as Extract<MoveConstraint, { kind: 'objective' }>;
		const after = predicted.find((p) => p.objectiveId === objectiveId)?.change ?? 0;
		const kept = keeps(after, bound, limit, OBJECTIVE_KEPT * (Math.abs(limit) + largest));
		return { index, kind, objectiveId, bound, limit, before: 0, after, kept, active, price };
	});
	if (sets.length === 0) return ofLinear;
	const after = applyDisplacement(surface.positions, input.moved, input.displacement);
	const extent = after.reduce((max, x) => Math.max(max, Math.abs(x)), 0);
	const ofSets = sets.map((set, i): ConstraintReport => {
		const { index, kind, bound, limit } = set;
		const { active, price, places } = prices?.sets[i] ?? none;
		const was = kind === 'displacement' ? { value: 0 } : worstPlace(set, surface.positions);
		const is = worstPlace(set, after);
		// By the slack, which asks of a wall that was too thin before only that it becomes no thinner.
		const kept = is === null || is.slack >= -PLACE_KEPT * extent;
		const v = is?.vertex ?? 0;
		const place: ConstraintReport['place'] = is && [after[3 * v], after[3 * v + 1], after[3 * v + 2]];
		return {
			index,
			kind,
			bound,
			limit,
			before: was?.value ?? null,
			after: is?.value ?? null,
			kept,
			places,
			place,
			active,
			price
		};
	});
	return [...ofLinear, ...ofSets].sort((a, b) => a.index - b.index);
}
