/** What the Bench says about boxes, fields and checks. */
import type { Box, Held } from '$lib/api/schemas/drawn';
import type { Objective } from '$lib/api/schemas/studies';
import { axisOf, boxAxis, faceNames, sideOf, type FaceName, type Placement } from './bench-geometry';

/** Planes of control points held at a face, as the surface feels it. */
export const heldNames = ['free', 'joined', 'tangent kept', 'curvature kept'] as const;

export const latticeWords = (box: Pick<Box, 'lattice'>) => box.lattice.join(' × ');

/** Where a face of a box looks, by the frame's nearest axis: `towards −x`. */
export function towards(box: Placement, face: FaceName): string {
	const axis = boxAxis(box, axisOf(face)).map((a) => a * sideOf(face));
	const k = axis.reduce((best, a, i) => (Math.abs(a) > Math.abs(axis[best]) ? i : best), 0);
	return `towards ${axis[k] < 0 ? '\u2212' : '+'}${'xyz'[k]}`;
}

/** `−x face tangent kept`, `2 faces held`, `no face held` */
export function heldWords(box: Placement & { held: Held }): string {
	const held = faceNames.filter((f) => box.held[f] > 0);
	if (held.length === 0) return 'no face held';
	if (held.length > 1) return `${held.length} faces held`;
	return `${towards(box, held[0]).replace('towards ', '')} face ${heldNames[box.held[held[0]]]}`;
}

/** `N per mm per m²`; a coefficient has no unit of its own. */
export function densityUnit(objective: Objective | undefined): string {
	const unit = objective?.unit;
	return `${unit && unit !== '1' ? `${unit} ` : ''}per mm per m²`;
}

/** The usual reference for a least radius, metres; it is suggested, never set by itself. */
export const leastRadius = {
	usual: 0.0025,
	source: 'UN R26',
	caution:
		'Checked, not steered by. UN Regulation No. 26 asks for 2.5 mm on the outside of cars, where a 100 mm sphere can touch. ' +
		'Which rule applies here is for the local codes and licensed practice to say.'
};

/** `N per m²`, of what a move changes. */
export function perArea(objective: Objective | undefined): string {
	const unit = objective?.unit;
	return `${unit && unit !== '1' ? `${unit} ` : ''}per m²`;
}

export const checkNames: Record<string, string> = {
	flipped: 'Flipped triangles',
	minAngle: 'Smallest angle',
	areaRatio: 'Largest change of a triangle’s area',
	selfIntersection: 'New self-intersections',
	thickness: 'Thinnest wall',
	keepOut: 'Nearest keep-out',
	radius: 'Smallest convex radius'
};

/** A check's name in words, also one that this page has not met. */
export const checkName = (key: string) =>
	checkNames[key] ??
	key.charAt(0).toUpperCase() +
		key
			.slice(1)
			.replace(/([A-Z])/g, ' $1')
			.toLowerCase();
