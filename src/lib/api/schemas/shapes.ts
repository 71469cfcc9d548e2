/** Shapes on the wire. */
import { z } from 'zod';
import { id, timestamp, person, bounds } from './common';
import { sensitivityMap, result } from './maps';
import { recipe, prediction, constraintAnswer, checks } from './moves';
import { finite, name } from './primitives';

export const shapeState = z
	.enum(['baseline', 'open', 'judged'])
	.describe('open: waits for the solver; judged: has a result');
export type ShapeState = z.infer<typeof shapeState>;

export const patch = z.object({ name: z.string(), firstTriangle: z.int(), triangleCount: z.int() });

export const shapeSummary = z.object({
	id,
	studyId: id,
	number: z.int(),
	parentId: id.nullable(),
	name: z.string(),
	note: z.string(),
	state: shapeState,
	volume: finite.nullable(),
	area: finite,
	closed: z.boolean(),
	step: finite.nullable(),
	smoothing: finite.nullable(),
	maxDisplacement: finite.nullable(),
	rmsDisplacement: finite.nullable(),
	predicted: z.array(prediction),
	results: z.array(result).describe('the latest for each objective and operating point'),
	mapCount: z.int(),
	createdAt: timestamp,
	createdBy: person.nullable()
});
export type ShapeSummary = z.infer<typeof shapeSummary>;

export const shape = shapeSummary.extend({
	topologyId: id,
	vertexCount: z.int(),
	triangleCount: z.int(),
	bounds,
	patches: z.array(patch),
	health: z.object({
		boundaryEdges: z.int(),
		nonManifoldEdges: z.int(),
		inconsistentEdges: z.int(),
		degenerateTriangles: z.int()
	}),
	filename: z.string().nullable().describe('of the original upload'),
	recipe: recipe.optional(),
	constraints: z.array(constraintAnswer),
	checks,
	maps: z.array(sensitivityMap).describe('the latest for each objective and operating point')
});
export type Shape = z.infer<typeof shape>;

export const shapeImportQuery = z.object({
	filename: z.string().min(1).max(255),
	name: name.optional()
});

export const stlQuery = z.object({
	encoding: z.enum(['binary', 'ascii']).optional().describe('default: as the baseline was uploaded')
});
