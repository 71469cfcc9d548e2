/** The words of senses, roles, states and map kinds, the same on every screen. */
import type { Role } from '$lib/api/schemas/common';
import type { ShapeState } from '$lib/api/schemas/shapes';
import type { Objective, Rehearsal } from '$lib/api/schemas/studies';

export const senseWords: Record<Objective['sense'], string> = {
	minimise: 'as low as possible',
	maximise: 'as high as possible',
	hold: 'hold as it is'
};

export const roleWords: Record<Role, { name: string; can: string }> = {
	engineer: { name: 'Engineer', can: 'uploads, moves, enters results, decides who is in the study' },
	reviewer: { name: 'Reviewer', can: 'reads everything and draws keep-outs, for packaging, styling or quality' },
	viewer: { name: 'Viewer', can: 'reads everything' }
};

export const stateWords: Record<ShapeState, { name: string; means: string }> = {
	baseline: { name: 'baseline', means: 'where the study starts' },
	open: { name: 'open', means: 'waits for the solver' },
	judged: { name: 'judged', means: 'has a result' }
};

/** `baseline`, `shape 4` */
export function shapeNumber(number: number): string {
	return number === 0 ? 'baseline' : `shape ${number}`;
}

/** `ME` for Mara Ekdal: first letters of the first and the last name. */
export function initials(name: string): string {
	const parts = name.trim().split(/\s+/).filter(Boolean);
	const letters = parts.length > 1 ? [parts[0], parts[parts.length - 1]] : [parts[0] ?? '?'];
	return letters
		.map((part) => [...part][0])
		.join('')
		.toUpperCase();
}

/** What a rehearsal objective computes. */
export const rehearsalWords: Record<Rehearsal['kind'], string> = {
	wettedArea: 'Wetted area',
	volume: 'Enclosed volume',
	frontalArea: 'Frontal area',
	impactDrag: 'Impact-pressure drag area'
};
