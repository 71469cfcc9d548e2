/**
 * The demo scenario as data: who, what, which maps, which moves, what the solver is said to have found. The demo command walks this
 * plan through the product's own services, so that every shape in it is a real move of a real import. Everything is invented: the
 * maker, the people, the pod, the maps and the results.
 */
import type { z } from 'zod';
import type { Role } from '$lib/api/schemas/common';
import type { boxCreate } from '$lib/api/schemas/drawn';
import type { objectiveCreate, operatingPointCreate, studyCreate } from '$lib/api/schemas/studies';
import { writeStl } from '$lib/morph';
import { mapCsv, type DemoObjective } from './maps';
import { podSurface, type DemoSurface } from './pod-mesh';

export type { DemoObjective, DemoSurface };

export interface DemoPerson {
	/** Role in the demo study; the admin is not a member of it. */
	role: Role | 'admin';
	name: string;
	email: string;
	password: string;
}

export type DemoBox = 'tail' | 'shoulder';

/** A move of the plan; the demo command replaces keys by the ids it got. */
export interface DemoMove {
	/** Number of the parent shape; the child is the next number. */
	parent: number;
	name: string;
	note: string;
	boxes: DemoBox[];
	/** Metres. */
	step: number;
	/** Metres. */
	smoothing: number;
	constraints: { kind: 'volume'; bound: 'hold' }[];
}

export interface DemoResult {
	objective: DemoObjective;
	/** Newtons. */
	value: number;
	uncertainty: number;
	note: string;
}

const INVENTED = 'Invented for the demo: no solver was run.';

const users: DemoPerson[] = [
	{ role: 'engineer', name: 'Mara Ebner', email: 'mara@planish.example', password: 'touring-pod-430' },
	{ role: 'reviewer', name: 'Okan Tuna', email: 'okan@planish.example', password: 'touring-pod-430' },
	{ role: 'viewer', name: 'Tilde Brask', email: 'tilde@planish.example', password: 'touring-pod-430' },
	{ role: 'admin', name: 'Ines Aldin', email: 'ines@planish.example', password: 'touring-pod-430' }
];

const study: z.input<typeof studyCreate> = {
	name: 'Touring pod 430',
	lengthUnit: 'mm',
	referenceArea: 0.27,
	density: 1.2,
	speed: 25,
	note:
		'Invented demo: a roof pod of 430 litres for touring vans. Its maker, its surface, its sensitivity maps and its results are ' +
		'made up; the moves between its shapes are real moves of this program.'
};

const objectives: { key: DemoObjective; create: z.input<typeof objectiveCreate> }[] = [
	{ key: 'drag', create: { name: 'Drag, headwind 90 km/h', unit: 'N', sense: 'minimise', weight: 1 } },
	{ key: 'lift', create: { name: 'Lift', unit: 'N', sense: 'hold', weight: 0 } }
];

const operatingPoints: z.input<typeof operatingPointCreate>[] = [
	{ name: 'Headwind 90 km/h', speed: 25, density: 1.2, yaw: 0, weight: 1 }
];

/** Both boxes end above the floor, two planes held there: floor, feet and the rounded lower edge keep their place. */
const boxes: { key: DemoBox; create: z.input<typeof boxCreate> }[] = [
	{
		key: 'tail',
		create: {
			name: 'Tail',
			centre: [0.76, 0, 0.225],
			halfSize: [0.44, 0.5, 0.185],
			lattice: [7, 5, 5],
			held: { u0: 2, u1: 0, v0: 0, v1: 0, w0: 2, w1: 0 }
		}
	},
	{
		key: 'shoulder',
		create: {
			name: 'Shoulder',
			centre: [-0.66, 0, 0.25],
			halfSize: [0.36, 0.5, 0.15],
			lattice: [7, 5, 4],
			held: { u0: 2, u1: 2, v0: 0, v1: 0, w0: 2, w1: 0 }
		}
	}
];

const moves: DemoMove[] = [
	{
		parent: 0,
		name: 'Tail drawn in',
		note: 'First move: the tail alone.',
		boxes: ['tail'],
		step: 0.004,
		smoothing: 0.025,
		constraints: [{ kind: 'volume', bound: 'hold' }]
	},
	{
		parent: 1,
		name: 'Tail and shoulder',
		note: 'A shorter step, the nose’s shoulder with it.',
		boxes: ['tail', 'shoulder'],
		step: 0.003,
		smoothing: 0.025,
		constraints: [{ kind: 'volume', bound: 'hold' }]
	}
];

const BASELINE: Record<DemoObjective, number> = { drag: 44.8, lift: -3.1 };
const UNCERTAINTY: Record<DemoObjective, number> = { drag: 0.35, lift: 0.4 };

/** Share of a predicted change that the invented solver finds: the longer the prediction, the more curvature takes off it. */
export function foundShare(change: number): number {
	return 0.8 + 0.1 / (1 + change * change);
}

/** Results are printed as a solver's report would print them. */
const twoDecimals = (value: number) => Math.round(100 * value) / 100;

/**
 * What the solver is said to have found for a shape.
 * @param predicted the move's predicted change of each objective (null for the baseline)
 * @param parent the parent's results (null for the baseline), newtons
 */
function results(
	shapeNumber: number,
	predicted: Record<DemoObjective, number> | null,
	parent: Record<DemoObjective, number> | null
): DemoResult[] {
	if ((predicted === null) !== (parent === null)) {
		throw new Error(`Demo shape ${shapeNumber}: a prediction and its parent’s result come together.`);
	}
	return objectives.map(({ key }) => ({
		objective: key,
		value: twoDecimals(predicted && parent ? parent[key] + foundShare(predicted[key]) * predicted[key] : BASELINE[key]),
		uncertainty: UNCERTAINTY[key],
		note: INVENTED
	}));
}

/** The scenario in the order in which it is loaded. */
export const demoPlan = {
	users,
	study,
	objectives,
	operatingPoints,
	boxes,
	baseline: {
		filename: 'touring-pod-430.stl',
		name: 'Baseline',
		/** ASCII STL in millimetres, a solid for each patch. About three seconds: build it once. */
		bytes(): Uint8Array {
			const surface = podSurface();
			return writeStl({ ...surface, attributes: null, encoding: 'ascii' }, { encoding: 'ascii' });
		}
	},
	/** Numbers of the shapes that get maps: the last one too, so that a next move can be made at once. */
	mappedShapes: [0, 1, 2],
	maps: objectives.map(({ key }) => ({
		objective: key,
		kind: 'density' as const,
		location: 'vertex' as const,
		outward: 'raises' as const,
		filename: (shapeNumber: number) => `touring-pod-430-shape-${shapeNumber}-${key}.csv`,
		/** CSV of this map on a shape as stored (positions in millimetres). The surface is borrowed. */
		bytes: (shapeNumber: number, surface: Pick<DemoSurface, 'positions' | 'triangles'>) =>
			mapCsv(key, shapeNumber, surface)
	})),
	moves,
	results
};

export type DemoPlan = typeof demoPlan;
