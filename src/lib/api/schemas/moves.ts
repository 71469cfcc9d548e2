/** Recipes of moves and what is answered about them, on the wire. */
import { z } from 'zod';
import { id, vec3, plane } from './common';
import { box, keepOut, lock } from './drawn';
import { finite, positive, name, note } from './primitives';
import { sense } from './studies';

export const bound = z.enum(['hold', 'atLeast', 'atMost']);
const patchNames = z.array(z.string().max(200)).min(1).max(1000);

export const constraintRequest = z.discriminatedUnion('kind', [
	z.object({
		kind: z.literal('volume'),
		bound: bound.default('hold'),
		value: positive.optional().describe('m^3; default: the parent’s volume'),
		patches: patchNames
			.optional()
			.describe('the part that these bound, each open edge closed by a fan to its middle; default: the whole body')
	}),
	z.object({
		kind: z.literal('objective'),
		objectiveId: id,
		bound,
		value: finite
			.optional()
			.describe(
				'in the objective’s unit; needs a result of the parent shape. Default: the parent’s own value, whatever it is'
			)
	}),
	z
		.object({
			kind: z.literal('displacement'),
			inward: finite.min(0).max(1000).optional().describe('m: how far inward a vertex may go'),
			outward: finite.min(0).max(1000).optional().describe('m: how far outward'),
			boxId: id.optional().describe('where it holds; default: everywhere'),
			patches: patchNames.optional().describe('where it holds; default: everywhere')
		})
		.refine((c) => c.inward !== undefined || c.outward !== undefined, {
			message: 'needs inward, outward or both',
			path: ['inward']
		}),
	z.object({
		kind: z.literal('keepOut'),
		keepOutId: id,
		clearance: finite.min(0).max(1000).optional().describe('m; default: the keep-out’s own')
	}),
	z.object({
		kind: z.literal('thickness'),
		least: positive.max(1000).describe('m, along rays inward from the surface'),
		patches: patchNames.optional().describe('where it holds; default: everywhere')
	}),
	z.object({
		kind: z.literal('radius'),
		least: positive
			.max(1000)
			.describe('m: smallest radius of convex curvature in the moved area. Not steered by: a hard check')
	})
]);
export type ConstraintRequest = z.infer<typeof constraintRequest>;

export const handMove = z.object({
	boxId: id,
	displacement: z
		.array(finite)
		.max(12_000)
		.describe('m; x, y, z of each control point, u slowest, w fastest: as many as the box has')
});

export const recipeRequest = z.object({
	boxIds: z.array(id).min(1).max(32),
	mode: z.enum(['lattice', 'surface']).default('lattice'),
	step: positive.max(1000).describe('m: the largest displacement of any vertex'),
	smoothing: finite.min(0).max(1000).default(0).describe('m: the length below which the move carries no detail'),
	weights: z.record(id, finite.min(0)).optional().describe('by objective; default: the study’s'),
	constraints: z
		.array(constraintRequest)
		.max(64)
		.default([{ kind: 'volume', bound: 'hold' }]),
	lockIds: z.array(id).max(200).optional().describe('default: all locks of the study'),
	symmetry: z.boolean().optional().describe('keep the study’s symmetry plane; default: yes, where it has one'),
	hand: z.array(handMove).max(32).default([]).describe('control points moved by hand'),
	handMode: z
		.enum(['add', 'replace'])
		.default('add')
		.describe('add: to the computed move, which makes good what it does to the constraints; replace: alone, as it is')
});
export type RecipeRequest = z.infer<typeof recipeRequest>;
export type RecipeInput = z.input<typeof recipeRequest>;

export const moveRequest = recipeRequest.extend({ name: name.optional(), note: note.optional() });

/** The complete input of a move: with the parent shape it reproduces the child bit for bit. */
export const recipe = z.object({
	engine: z.string().describe('version of the engine that made the move'),
	mode: z.enum(['lattice', 'surface']),
	step: finite,
	smoothing: finite,
	weights: z.record(id, finite),
	constraints: z.array(constraintRequest),
	boxIds: z.array(id),
	boxes: z.array(box).describe('as they were when the move was made'),
	mapIds: z.array(id),
	mapWeights: z
		.record(id, finite)
		.describe('share of each map in the gradient of its objective: operating points by weight, sum 1'),
	senses: z.record(id, sense).describe('of the objectives when the move was made'),
	symmetry: plane.nullable().describe('the plane kept, if any'),
	locks: z.array(lock).describe('as they were when the move was made'),
	keepOuts: z.array(keepOut).describe('those that the constraints name, as they were when the move was made'),
	hand: z.array(handMove),
	handMode: z.enum(['add', 'replace']),
	parentValues: z
		.record(id, finite)
		.describe('the parent’s results of constrained objectives, which an absolute bound is measured against')
});
export type Recipe = z.infer<typeof recipe>;

export const prediction = z.object({
	objectiveId: id,
	change: finite
		.nullable()
		.describe('first order, in the objective’s unit; null: no map of this objective on the parent shape')
});
export type Prediction = z.infer<typeof prediction>;

export const constraintAnswer = z.object({
	kind: z.enum(['volume', 'objective', 'displacement', 'keepOut', 'thickness']),
	objectiveId: id.optional(),
	keepOutId: id.optional(),
	name: z.string().optional().describe('of the keep-out'),
	patches: z.array(z.string()).optional(),
	index: z.int().describe('of the constraint in the recipe'),
	bound,
	unit: z.string(),
	limit: finite.nullable().describe('the bound itself, in `unit`'),
	before: finite.nullable(),
	after: finite.nullable(),
	kept: z.boolean(),
	active: z.boolean().describe('whether it binds'),
	price: finite
		.nullable()
		.describe('gain in the weighted objective for relaxing by one unit at the same length of the move; null when free'),
	places: z.int().optional().describe('vertices at which it binds'),
	place: vec3.nullable().optional().describe('m, where `after` is found')
});
export type ConstraintAnswer = z.infer<typeof constraintAnswer>;

export const check = z.object({
	value: finite,
	limit: finite,
	unit: z.string(),
	ok: z.boolean(),
	hard: z.boolean().describe('a move that breaks a hard check can be previewed, not committed'),
	count: z.int().optional().describe('how many triangles, vertices or pairs break the limit'),
	before: finite.optional().describe('of the parent, where the check compares with it'),
	label: z.string().optional().describe('of the keep-out'),
	triangle: z.int().optional(),
	place: vec3.optional().describe('m, where the value is found')
});
export type Check = z.infer<typeof check>;

export const checks = z.record(z.string(), check);

export const moveAnswer = z.object({
	predicted: z.array(prediction).describe('in the order of the study’s objectives'),
	weightedChange: finite,
	maxDisplacement: finite,
	rmsDisplacement: finite.describe('over the vertices inside the boxes'),
	insideVertices: z.int(),
	volumeBefore: finite.nullable().describe('null for an open surface'),
	volumeAfter: finite.nullable(),
	constraints: z.array(constraintAnswer),
	checks,
	lattices: z.array(
		z.object({
			boxId: id,
			mirrored: z.boolean().describe('of the box’s mirror image, which symmetry added'),
			displacement: z.array(finite).describe('m; x, y, z of each control point, u slowest, w fastest')
		})
	),
	field: z
		.object({
			vertices: z.string().describe('base64 of uint32 ids, ascending'),
			displacement: z.string().describe('base64 of float32 x, y, z of each, m')
		})
		.nullable()
		.describe('the displacement itself, where no lattice gives it (mode "surface"); else null'),
	caution: z.string()
});
export type MoveAnswer = z.infer<typeof moveAnswer>;
