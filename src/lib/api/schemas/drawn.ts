/** What people draw on a surface, on the wire: design boxes, keep-outs, locks. Metres, in the study’s frame. */
import { z } from 'zod';
import { id, vec3, plane, timestamp } from './common';
import { finite, positive, name } from './primitives';

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
