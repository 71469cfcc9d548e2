import { MorphError } from './errors';
import type { GradientCache, Prepared } from './fields';
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
	objectives: MoveObjective[]
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
		if (!surface.watertight) {
			throw new MorphError(
				'mesh-open',
				'The surface is open, so it encloses no volume that a move could keep.',
				'Close the surface, or remove the volume constraint.',
				place
			);
		}
		const gradient = surface.volumeGradient;
		const limit = value ?? surface.volume;
		const change = limit - surface.volume;
		return { constraint, index, prepared: gradients.get(gradient), gradient, limit, change, label: 'volume' };
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
	return { constraint, index, prepared: gradients.get(gradient), gradient, limit, change: limit, label };
}
