/** Studies, their objectives and operating points on the wire. */
import { z } from 'zod';
import { id, plane, timestamp, lengthUnit, role } from './common';
import { box, keepOut, lock } from './drawn';
import { finite, positive, name, note } from './primitives';

export const sense = z.enum(['minimise', 'maximise', 'hold']);
export type Sense = z.infer<typeof sense>;

export const rehearsal = z
	.object({
		kind: z.enum(['wettedArea', 'volume', 'frontalArea', 'impactDrag']),
		direction: plane.shape.normal.optional().describe('unit, of the flow; for frontalArea and impactDrag. Default: +x'),
		stagnation: positive.max(10).optional().describe('largest pressure coefficient of impactDrag; default 2 (Newton)'),
		patches: z.array(z.string().max(200)).max(1000).optional().describe('default: the whole surface')
	})
	.describe('a built-in analytic objective, for trying boxes and constraints with no solver: not a flow solution');
export type Rehearsal = z.infer<typeof rehearsal>;

export const objectiveCreate = z.object({
	name,
	unit: z.string().trim().max(24).describe('of the value the solver returns; "1" or empty for a coefficient'),
	sense,
	weight: finite.min(0).default(1),
	rehearsal: rehearsal
		.nullable()
		.default(null)
		.describe('what is computed in place of a solver; its unit is then m² or m³')
});

export const objective = objectiveCreate.extend({ id, position: z.int(), weight: finite });
export type Objective = z.infer<typeof objective>;

export const objectiveUpdate = z.object({
	name: name.optional(),
	sense: sense.optional(),
	weight: finite.min(0).optional()
});

export const operatingPointCreate = z.object({
	name,
	speed: positive.optional().describe('m/s'),
	density: positive.optional().describe('kg/m^3'),
	yaw: finite.optional().describe('degrees'),
	weight: finite.min(0).default(1)
});

export const operatingPoint = z.object({
	id,
	name: z.string(),
	speed: finite.nullable(),
	density: finite.nullable(),
	yaw: finite.nullable(),
	weight: finite
});
export type OperatingPoint = z.infer<typeof operatingPoint>;

export const studyCreate = z.object({
	name,
	lengthUnit: lengthUnit.describe('of the files that come in and go out; the API itself speaks metres'),
	referenceArea: positive.optional().describe('m^2'),
	density: positive.optional().describe('kg/m^3'),
	speed: positive.optional().describe('m/s'),
	note: note.optional()
});

export const studyUpdate = z.object({
	name: name.optional(),
	referenceArea: positive.nullable().optional(),
	density: positive.nullable().optional(),
	speed: positive.nullable().optional(),
	symmetry: plane.nullable().optional().describe('plane of mirror symmetry that moves keep'),
	note: note.optional()
});

export const studySummary = z.object({
	id,
	name: z.string(),
	note: z.string(),
	lengthUnit,
	role: role.describe('the caller’s role in this study'),
	shapeCount: z.int(),
	invented: z.boolean().describe('true for the demo study: its geometry, maps and results are invented'),
	createdAt: timestamp,
	updatedAt: timestamp
});
export type StudySummary = z.infer<typeof studySummary>;

export const study = studySummary.extend({
	referenceArea: finite.nullable(),
	density: finite.nullable(),
	speed: finite.nullable(),
	objectives: z.array(objective),
	operatingPoints: z.array(operatingPoint),
	symmetry: plane.nullable(),
	boxes: z.array(box),
	keepOuts: z.array(keepOut),
	locks: z.array(lock)
});
export type Study = z.infer<typeof study>;
