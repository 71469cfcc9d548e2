/**
 * What goes over the wire: one zod schema for each request and answer of the API. Handlers validate with them, serialisers
 * parse their answers through them (so a field that is not listed here does not leave), OpenAPI is generated from them and
 * the browser's client takes its types from them. SI throughout: metres, cubic metres, square metres, seconds.
 */
import { z } from 'zod';

const finite = z.number();
const positive = finite.positive();
const name = z.string().trim().min(1).max(120);
const note = z.string().trim().max(2000);

export const id = z.uuid();
export const vec3 = z.tuple([finite, finite, finite]);
export const timestamp = z.iso.datetime();

export const lengthUnit = z.enum(['m', 'mm', 'cm', 'in']);
export type LengthUnit = z.infer<typeof lengthUnit>;

export const role = z
	.enum(['viewer', 'reviewer', 'engineer'])
	.describe('Role in a study; each includes the ones before it.');
export type Role = z.infer<typeof role>;

/** Who did something, as shown beside it. */
export const person = z.object({ id, name: z.string() });
export type Person = z.infer<typeof person>;

// --- people, tokens --------------------------------------------------------------------------------------------------

const email = z.email().max(254).toLowerCase();
const password = z.string().min(12, 'at least 12 characters').max(200);

export const user = z.object({
	id,
	email: z.string(),
	name: z.string(),
	isAdmin: z.boolean(),
	active: z.boolean(),
	createdAt: timestamp
});
export type User = z.infer<typeof user>;

export const userCreate = z.object({ email, name, password, isAdmin: z.boolean().default(false) });
export const userUpdate = z.object({
	name: name.optional(),
	password: password.optional(),
	isAdmin: z.boolean().optional(),
	active: z.boolean().optional().describe('false: the person cannot sign in and their tokens stop working')
});

export const member = z.object({ userId: id, name: z.string(), email: z.string(), role });
export type Member = z.infer<typeof member>;
export const memberPut = z.object({ email, role });

export const token = z.object({
	id,
	name: z.string(),
	prefix: z.string().describe('the first characters, to tell tokens apart'),
	studyId: id.nullable().describe('null: every study of its owner'),
	owner: person,
	createdAt: timestamp,
	lastUsedAt: timestamp.nullable(),
	revokedAt: timestamp.nullable()
});
export type Token = z.infer<typeof token>;
export const tokenCreate = z.object({ name, studyId: id.optional() });
export const tokenCreated = token.extend({ token: z.string().describe('shown once; only its hash is kept') });

// --- studies ---------------------------------------------------------------------------------------------------------

export const sense = z.enum(['minimise', 'maximise', 'hold']);
export type Sense = z.infer<typeof sense>;

export const objectiveCreate = z.object({
	name,
	unit: z.string().trim().max(24).describe('of the value the solver returns; "1" or empty for a coefficient'),
	sense,
	weight: finite.min(0).default(1)
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

// --- design boxes ----------------------------------------------------------------------------------------------------

const heldPlanes = z.int().min(0).max(3).default(0);
export const held = z
	.object({ u0: heldPlanes, u1: heldPlanes, v0: heldPlanes, v1: heldPlanes, w0: heldPlanes, w1: heldPlanes })
	.describe('planes of control points held at each face: 1 joins continuously, 2 with tangent, 3 with curvature');
export type Held = z.infer<typeof held>;

const latticeCount = z.int().min(2).max(20);
const boxFields = {
	name,
	centre: vec3.describe('m'),
	halfSize: z.tuple([positive, positive, positive]).describe('m, along the box’s own axes'),
	rotation: z
		.tuple([finite, finite, finite, finite])
		.refine((q) => Math.abs(Math.hypot(...q) - 1) < 1e-6, 'must be a unit quaternion')
		.default([0, 0, 0, 1])
		.describe('unit quaternion x, y, z, w turning box axes into the study’s frame'),
	lattice: z.tuple([latticeCount, latticeCount, latticeCount]).describe('control points along u, v, w'),
	basis: z.enum(['bernstein', 'bspline']).default('bernstein'),
	degree: z.int().min(1).max(3).optional().describe('of the B-spline; Bernstein uses points - 1'),
	held: held.default({ u0: 0, u1: 0, v0: 0, v1: 0, w0: 0, w1: 0 }),
	axes: z
		.array(z.enum(['x', 'y', 'z']))
		.min(1)
		.max(3)
		.refine((a) => new Set(a).size === a.length, 'names an axis twice')
		.default(['x', 'y', 'z']),
	frame: z.enum(['box', 'world']).default('box').describe('whose axes `axes` names')
};
export const boxCreate = z.object(boxFields).refine((b) => b.lattice[0] * b.lattice[1] * b.lattice[2] <= 4000, {
	message: 'more than 4,000 control points in all',
	path: ['lattice']
});
export type BoxCreate = z.infer<typeof boxCreate>;
export const box = z.object({
	...boxFields,
	id,
	studyId: id,
	version: z.int().describe('each edit is a new version; a recipe keeps the one it used'),
	updatedAt: timestamp
});
export type Box = z.infer<typeof box>;

export const study = studySummary.extend({
	referenceArea: finite.nullable(),
	density: finite.nullable(),
	speed: finite.nullable(),
	objectives: z.array(objective),
	operatingPoints: z.array(operatingPoint),
	boxes: z.array(box)
});
export type Study = z.infer<typeof study>;

// --- sensitivity maps ------------------------------------------------------------------------------------------------

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
	createdBy: person.nullable()
});
export type SensitivityMap = z.infer<typeof sensitivityMap>;

// --- results ---------------------------------------------------------------------------------------------------------

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
	createdAt: timestamp,
	createdBy: person.nullable()
});
export type Result = z.infer<typeof result>;

// --- moves -----------------------------------------------------------------------------------------------------------

export const bound = z.enum(['hold', 'atLeast', 'atMost']);
export const constraintRequest = z.discriminatedUnion('kind', [
	z.object({
		kind: z.literal('volume'),
		bound: bound.default('hold'),
		value: positive.optional().describe('m^3; default: the parent’s volume')
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
	})
]);
export type ConstraintRequest = z.infer<typeof constraintRequest>;

export const recipeRequest = z.object({
	boxIds: z.array(id).min(1).max(32),
	mode: z.enum(['lattice', 'surface']).default('lattice'),
	step: positive.max(1000).describe('m: the largest displacement of any vertex'),
	smoothing: finite.min(0).max(1000).default(0).describe('m: the length below which the move carries no detail'),
	weights: z.record(id, finite).optional().describe('by objective; default: the study’s'),
	constraints: z
		.array(constraintRequest)
		.max(64)
		.default([{ kind: 'volume', bound: 'hold' }])
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
	kind: z.enum(['volume', 'objective']),
	objectiveId: id.optional(),
	bound,
	unit: z.string(),
	before: finite.nullable(),
	after: finite.nullable(),
	active: z.boolean(),
	price: finite
		.nullable()
		.describe('gain in the weighted objective for relaxing by one unit at the same length of the move; null when free')
});
export type ConstraintAnswer = z.infer<typeof constraintAnswer>;

export const check = z.object({
	value: finite,
	limit: finite,
	unit: z.string(),
	ok: z.boolean(),
	hard: z.boolean().describe('a move that breaks a hard check can be previewed, not committed'),
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
			displacement: z.array(finite).describe('m; x, y, z of each control point, u slowest, w fastest')
		})
	),
	caution: z.string()
});
export type MoveAnswer = z.infer<typeof moveAnswer>;

// --- shapes ----------------------------------------------------------------------------------------------------------

export const shapeState = z
	.enum(['baseline', 'open', 'judged'])
	.describe('open: waits for the solver; judged: has a result');
export type ShapeState = z.infer<typeof shapeState>;

export const patch = z.object({ name: z.string(), firstTriangle: z.int(), triangleCount: z.int() });
export const bounds = z.object({ min: vec3, max: vec3 });

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

// --- jobs ------------------------------------------------------------------------------------------------------------

/** RFC 9457, with our stable `code`, the `mend`, and field errors by JSON pointer. */
export const problem = z.object({
	type: z.string(),
	title: z.string(),
	status: z.int(),
	detail: z.string(),
	code: z.string(),
	mend: z.string().optional().describe('what to do about it'),
	errors: z.array(z.object({ pointer: z.string(), detail: z.string() })).optional()
});
export type Problem = z.infer<typeof problem>;

export const jobKind = z.enum(['import-shape', 'import-map', 'move']);
export const jobState = z.enum(['queued', 'running', 'done', 'failed', 'cancelled']);
export const jobAccepted = z.object({ jobId: id });
export const job = z.object({
	id,
	kind: jobKind,
	studyId: id,
	state: jobState,
	progress: finite.min(0).max(1),
	message: z.string(),
	result: z.record(z.string(), z.unknown()).optional(),
	error: problem.optional(),
	createdAt: timestamp
});
export type Job = z.infer<typeof job>;

export const shapeImported = z.object({ shapeId: id });
export const mapImported = mapReport.extend({ mapId: id });
export type MapImported = z.infer<typeof mapImported>;
export const moveCommitted = moveAnswer.extend({ shapeId: id, moveId: id });
export type MoveCommitted = z.infer<typeof moveCommitted>;

export const health = z.object({ status: z.literal('ok') });
