/** Sensitivity maps and results on the wire. */
import { z } from 'zod';
import { id, timestamp, person } from './common';
import { finite, note } from './primitives';

export const mapKind = z.enum(['density', 'nodal', 'vector']);
export const mapLocation = z.enum(['vertex', 'face']);
export const mapOutward = z.enum(['raises', 'lowers']);

export const mapImportQuery = z.object({
	objectiveId: id,
	operatingPointId: id.optional().describe('default: the study’s first operating point'),
	filename: z.string().min(1).max(255),
	kind: mapKind,
	location: mapLocation.default('vertex'),
	outward: mapOutward
		.default('raises')
		.describe('what a positive value means: moving outward raises, or lowers, the objective')
});

/** How well a map's rows met the surface. Distances in metres. */
export const mapReport = z.object({
	rows: z.int(),
	matched: z.int(),
	unmatched: z.int(),
	maxDistance: finite,
	coverage: finite.min(0).max(1).describe('share of the surface’s area that got a value'),
	total: finite.describe(
		'sum over the surface of gradient . outward normal: the objective’s change per metre of uniform growth'
	)
});

export const sensitivityMap = z.object({
	id,
	shapeId: id,
	objectiveId: id,
	operatingPointId: id,
	filename: z.string(),
	kind: mapKind,
	location: mapLocation,
	outward: mapOutward,
	report: mapReport,
	createdAt: timestamp,
	createdBy: person.nullable(),
	rehearsal: z.boolean().describe('computed by a rehearsal objective: not a flow solution')
});
export type SensitivityMap = z.infer<typeof sensitivityMap>;

export const resultCreate = z.object({
	objectiveId: id,
	operatingPointId: id.optional(),
	value: finite,
	uncertainty: finite
		.min(0)
		.optional()
		.describe('half width of the band the solver’s own noise spans, in the objective’s unit'),
	note: note.optional()
});

export const result = z.object({
	id,
	shapeId: id,
	objectiveId: id,
	operatingPointId: id,
	value: finite,
	uncertainty: finite.nullable(),
	note: z.string(),
	rehearsal: z.boolean().describe('computed by a rehearsal objective: not a flow solution'),
	createdAt: timestamp,
	createdBy: person.nullable()
});
export type Result = z.infer<typeof result>;

export const rehearsalRequest = z.object({
	objectiveIds: z.array(id).min(1).max(100).optional().describe('default: all rehearsal objectives of the study')
});
