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
/** A plane by a point and its unit normal, metres. */
export const plane = z.object({
	point: vec3.describe('m'),
	normal: vec3.refine((n) => Math.abs(Math.hypot(...n) - 1) < 1e-6, 'must have length 1')
});
export type Plane = z.infer<typeof plane>;
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

// --- design boxes ----------------------------------------------------------------------------------------------------

const heldPlanes = z.int().min(0).max(3).default(0);
export const held = z
	.object({ u0: heldPlanes, u1: heldPlanes, v0: heldPlanes, v1: heldPlanes, w0: heldPlanes, w1: heldPlanes })
	.describe('planes of control points held at each face: 1 joins continuously, 2 with tangent, 3 with curvature');
export type Held = z.infer<typeof held>;

const rotation = z
	.tuple([finite, finite, finite, finite])
	.refine((q) => Math.abs(Math.hypot(...q) - 1) < 1e-6, 'must be a unit quaternion')
	.default([0, 0, 0, 1])
	.describe('unit quaternion x, y, z, w turning box axes into the study’s frame');
const latticeCount = z.int().min(2).max(20);
const boxFields = {
	name,
	centre: vec3.describe('m'),
	halfSize: z.tuple([positive, positive, positive]).describe('m, along the box’s own axes'),
	rotation,
	lattice: z.tuple([latticeCount, latticeCount, latticeCount]).describe('control points along u, v, w'),
	basis: z.enum(['bernstein', 'bspline']).default('bernstein'),
	degree: z.int().min(1).max(3).optional().describe('of the B-spline; Bernstein uses points - 1'),
	held: held.default({ u0: 0, u1: 0, v0: 0, v1: 0, w0: 0, w1: 0 }),
	heldPoints: z
		.array(z.int().min(0).max(3999))
		.max(4000)
		.default([])
		.describe('single control points held, ((i*nv)+j)*nw+k'),
	axes: z
		.array(z.enum(['x', 'y', 'z']))
		.min(1)
		.max(3)
		.refine((a) => new Set(a).size === a.length, 'names an axis twice')
		.default(['x', 'y', 'z']),
	frame: z.enum(['box', 'world']).default('box').describe('whose axes `axes` names')
};
const latticeSize = [
	(b: { lattice: [number, number, number] }) => b.lattice[0] * b.lattice[1] * b.lattice[2] <= 4000,
	{ message: 'more than 4,000 control points in all', path: ['lattice'] }
] as [(b: { lattice: [number, number, number] }) => boolean, { message: string; path: string[] }];
export const boxCreate = z.object(boxFields).refine(...latticeSize);
export type BoxCreate = z.infer<typeof boxCreate>;
/** Which version a change was made on. */
const basedOn = z.int().min(1).optional().describe('the version that the change was made on; another by now: 409');
export const boxReplace = z.object({ ...boxFields, version: basedOn }).refine(...latticeSize);
export const box = z.object({
	...boxFields,
	id,
	studyId: id,
	version: z.int().describe('each edit is a new version; a recipe keeps the one it used'),
	updatedAt: timestamp
});
export type Box = z.infer<typeof box>;

// --- keep-outs, locks ------------------------------------------------------------------------------------------------

export const keepOutSide = z.enum(['outside', 'inside']).describe('where the surface must stay');
const halfSpace = z.object({
	kind: z.literal('halfSpace'),
	point: vec3.describe('m, on the plane'),
	normal: plane.shape.normal.describe('unit, out of the half that is kept out')
});
const keepOutBox = z.object({
	kind: z.literal('box'),
	centre: vec3.describe('m'),
	halfSize: z.tuple([positive, positive, positive]).describe('m'),
	rotation
});
const keepOutMesh = z.object({
	kind: z.literal('mesh'),
	filename: z.string(),
	vertexCount: z.int(),
	triangleCount: z.int(),
	bounds: z.object({ min: vec3, max: vec3 }).describe('m')
});
const keepOutFields = {
	name,
	side: keepOutSide.default('outside'),
	clearance: finite.min(0).max(1000).default(0).describe('m: least distance from it')
};
export const keepOutCreate = z.object({
	...keepOutFields,
	geometry: z.discriminatedUnion('kind', [halfSpace, keepOutBox])
});
export const keepOutReplace = z.object({
	...keepOutFields,
	geometry: z
		.discriminatedUnion('kind', [halfSpace, keepOutBox])
		.optional()
		.describe('left out for an uploaded surface'),
	version: basedOn
});
export const keepOutDefinition = z.object({
	...keepOutFields,
	geometry: z.discriminatedUnion('kind', [halfSpace, keepOutBox, keepOutMesh])
});
export type KeepOutDefinition = z.infer<typeof keepOutDefinition>;
export const keepOut = keepOutDefinition.extend({ id, studyId: id, version: z.int(), updatedAt: timestamp });
export type KeepOut = z.infer<typeof keepOut>;
export const keepOutImportQuery = z.object({
	filename: z.string().min(1).max(255),
	name: name.optional(),
	side: keepOutSide.default('outside'),
	clearance: z.coerce.number().min(0).max(1000).default(0).describe('m')
});

const lockFields = {
	name,
	patches: z.array(z.string().max(200)).max(1000).default([]).describe('names of locked patches'),
	painted: z
		.object({
			topologyId: id.describe('of the shapes that the triangles are of'),
			ranges: z
				.array(z.int().min(0))
				.max(400_000)
				.refine((r) => r.length % 2 === 0, 'must hold pairs')
				.describe('first triangle and number of triangles of each run, ascending')
		})
		.nullable()
		.default(null),
	blend: finite
		.min(0)
		.max(1000)
		.default(0)
		.describe('m along the surface over which the move grows from nothing to whole')
};
const locksSomething = [
	(l: { patches: string[]; painted: { ranges: number[] } | null }) =>
		l.patches.length > 0 || (l.painted !== null && l.painted.ranges.length > 0),
	{ message: 'names no patch and no triangle', path: ['patches'] }
] as [(l: { patches: string[]; painted: { ranges: number[] } | null }) => boolean, { message: string; path: string[] }];
export const lockCreate = z.object(lockFields).refine(...locksSomething);
export type LockCreate = z.infer<typeof lockCreate>;
export const lockReplace = z.object({ ...lockFields, version: basedOn }).refine(...locksSomething);
export const lock = z.object({ ...lockFields, id, studyId: id, version: z.int(), updatedAt: timestamp });
export type Lock = z.infer<typeof lock>;

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
	createdBy: person.nullable(),
	rehearsal: z.boolean().describe('computed by a rehearsal objective: not a flow solution')
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
	rehearsal: z.boolean().describe('computed by a rehearsal objective: not a flow solution'),
	createdAt: timestamp,
	createdBy: person.nullable()
});
export type Result = z.infer<typeof result>;

export const rehearsalRequest = z.object({
	objectiveIds: z.array(id).min(1).max(100).optional().describe('default: all rehearsal objectives of the study')
});

// --- moves -----------------------------------------------------------------------------------------------------------

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

export const jobKind = z.enum(['import-shape', 'import-map', 'import-keep-out', 'rehearse', 'move']);
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
