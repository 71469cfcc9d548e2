import { MorphError } from './errors';
import type { GradientCache, Prepared } from './fields';
import type { VolumeChange } from './volume-change';
import type { MoveConstraint, MoveObjective, Surface } from './types';

export type LinearBound = Extract<MoveConstraint, { kind: 'volume' | 'objective' }>;

/** A volume or objective constraint with its gradient brought into the space. */
export interface LinearPart {
	constraint: LinearBound;
	/** In the request. */
	index: number;
	prepared: Prepared;
	/** N x 3, of the constrained value. */
	gradient: Float64Array;
	/** The bound in the constraint's own unit: m^3, or the objective's change. */
	limit: number;
	/** What the value may change by. */
	change: number;
	label: string;
	/** Of a volume: what it is now, and how it changes. */
	volume: EnclosedVolume | null;
}

/** The whole body's volume, or a part's. */
export interface EnclosedVolume {
	/** m^3 */
	before: number;
	/** N x 3 */
	gradient: Float64Array;
	change: VolumeChange;
}

const BOUNDS = ['hold', 'atLeast', 'atMost'];

/**
 * @param index of the constraint in the request
 * @throws MorphError constraint-invalid, mesh-open, gradient-missing
 */
export function linearPart(
	constraint: LinearBound,
	index: number,
	surface: Surface,
	gradients: GradientCache,
	objectives: MoveObjective[],
	volumeOf: (part: Uint32Array | undefined) => EnclosedVolume
): LinearPart {
	const { bound, value } = constraint;
	const place = { constraint: index };
	if (value !== undefined && !Number.isFinite(value)) {
		throw new MorphError('constraint-invalid', `The bound ${value} is no number.`, 'Give a finite bound.', place);
	}
	if (!BOUNDS.includes(bound)) {
		throw new MorphError(
			'constraint-invalid',
			`The bound "${String(bound)}" is unknown.`,
			'Give hold, atLeast or atMost.',
			place
		);
	}
	if (constraint.kind === 'volume') {
		if (!surface.watertight && !constraint.part) {
			throw new MorphError(
				'mesh-open',
				'The surface is open, so it encloses no volume that a move could keep.',
				'Close the surface, or remove the volume constraint.',
				place
			);
		}
		const volume = volumeOf(constraint.part);
		const { gradient, before } = volume;
		const limit = value ?? before;
		const label = constraint.part ? 'volume of a part' : 'volume';
		return {
			constraint,
			index,
			prepared: gradients.get(gradient),
			gradient,
			limit,
			change: limit - before,
			label,
			volume
		};
	}
	const objective = objectives.find((o) => o.id === constraint.objectiveId);
	if (!objective) {
		throw new MorphError(
			'gradient-missing',
			`The constrained objective "${constraint.objectiveId}" has no map.`,
			'Upload its map for this shape, or remove the constraint.',
			{ ...place, objective: constraint.objectiveId }
		);
	}
	const { gradient } = objective;
	const limit = value ?? 0;
	const label = `objective ${objective.id}`;
	return { constraint, index, prepared: gradients.get(gradient), gradient, limit, change: limit, label, volume: null };
}
