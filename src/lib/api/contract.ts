/**
 * Every operation of the API in one table: its path, who may call it, what it takes and what it answers. Route handlers are
 * made from these rows (server/http/handle.ts), `/api/openapi.json` is generated from them, and a test walks them with every
 * role. A route without a row, or a row without a route, fails that test.
 */
import { z } from 'zod';
import * as s from './schemas';

/** The least a caller must be. Study roles are those of the study that the path's subject belongs to. */
export type Access = 'public' | 'user' | 'viewer' | 'reviewer' | 'engineer' | 'admin';

/** What the `{id}` of the path names; the study whose role counts is found through it. */
export type Subject =
	'study' | 'shape' | 'topology' | 'map' | 'box' | 'keepOut' | 'lock' | 'objective' | 'job' | 'user' | 'token' | 'none';

export interface Operation {
	method: 'GET' | 'POST' | 'PUT' | 'PATCH' | 'DELETE';
	path: `/api/${string}`;
	summary: string;
	access: Access;
	subject: Subject;
	query?: z.ZodObject;
	/** A schema for JSON; 'bytes' for a streamed file. */
	body?: z.ZodType | 'bytes';
	status: 200 | 201 | 202 | 204;
	/** A schema for JSON; else what the answer is. */
	answer: z.ZodType | 'bytes' | 'events' | 'none';
}

const op = <const O extends Operation>(o: O) => o;

export const operations = {
	health: op({
		method: 'GET',
		path: '/api/health',
		summary: 'Is it up',
		access: 'public',
		subject: 'none',
		status: 200,
		answer: s.health
	}),
	openapi: op({
		method: 'GET',
		path: '/api/openapi.json',
		summary: 'This description',
		access: 'public',
		subject: 'none',
		status: 200,
		answer: z.record(z.string(), z.unknown())
	}),

	listStudies: op({
		method: 'GET',
		path: '/api/studies',
		summary: 'The studies you are a member of',
		access: 'user',
		subject: 'none',
		status: 200,
		answer: z.array(s.studySummary)
	}),
	createStudy: op({
		method: 'POST',
		path: '/api/studies',
		summary: 'Make a study; its maker becomes its engineer',
		access: 'user',
		subject: 'none',
		body: s.studyCreate,
		status: 201,
		answer: s.study
	}),
	getStudy: op({
		method: 'GET',
		path: '/api/studies/{id}',
		summary: 'A study with its objectives, operating points and boxes',
		access: 'viewer',
		subject: 'study',
		status: 200,
		answer: s.study
	}),
	updateStudy: op({
		method: 'PATCH',
		path: '/api/studies/{id}',
		summary: 'Change a study’s name, note or reference values',
		access: 'engineer',
		subject: 'study',
		body: s.studyUpdate,
		status: 200,
		answer: s.study
	}),

	listMembers: op({
		method: 'GET',
		path: '/api/studies/{id}/members',
		summary: 'People of a study',
		access: 'viewer',
		subject: 'study',
		status: 200,
		answer: z.array(s.member)
	}),
	putMember: op({
		method: 'PUT',
		path: '/api/studies/{id}/members',
		summary: 'Add a person by e-mail, or change their role',
		access: 'engineer',
		subject: 'study',
		body: s.memberPut,
		status: 200,
		answer: z.array(s.member)
	}),
	removeMember: op({
		method: 'DELETE',
		path: '/api/studies/{id}/members/{userId}',
		summary: 'Take a person out of a study; its last engineer stays',
		access: 'engineer',
		subject: 'study',
		status: 200,
		answer: z.array(s.member)
	}),

	createObjective: op({
		method: 'POST',
		path: '/api/studies/{id}/objectives',
		summary: 'Add an objective',
		access: 'engineer',
		subject: 'study',
		body: s.objectiveCreate,
		status: 201,
		answer: s.objective
	}),
	updateObjective: op({
		method: 'PATCH',
		path: '/api/objectives/{id}',
		summary: 'Change an objective’s name, sense or weight',
		access: 'engineer',
		subject: 'objective',
		body: s.objectiveUpdate,
		status: 200,
		answer: s.objective
	}),
	createOperatingPoint: op({
		method: 'POST',
		path: '/api/studies/{id}/operating-points',
		summary: 'Add an operating point',
		access: 'engineer',
		subject: 'study',
		body: s.operatingPointCreate,
		status: 201,
		answer: s.operatingPoint
	}),

	createBox: op({
		method: 'POST',
		path: '/api/studies/{id}/boxes',
		summary: 'Add a design box',
		access: 'engineer',
		subject: 'study',
		body: s.boxCreate,
		status: 201,
		answer: s.box
	}),
	replaceBox: op({
		method: 'PUT',
		path: '/api/boxes/{id}',
		summary: 'A new version of a design box; moves made before keep theirs',
		access: 'engineer',
		subject: 'box',
		body: s.boxReplace,
		status: 200,
		answer: s.box
	}),
	removeBox: op({
		method: 'DELETE',
		path: '/api/boxes/{id}',
		summary: 'Put a design box away; its history stays',
		access: 'engineer',
		subject: 'box',
		status: 200,
		answer: s.box
	}),
	restoreBox: op({
		method: 'POST',
		path: '/api/boxes/{id}/restore',
		summary: 'Bring a design box back',
		access: 'engineer',
		subject: 'box',
		status: 200,
		answer: s.box
	}),

	createKeepOut: op({
		method: 'POST',
		path: '/api/studies/{id}/keep-outs',
		summary: 'Add a keep-out',
		access: 'reviewer',
		subject: 'study',
		body: s.keepOutCreate,
		status: 201,
		answer: s.keepOut
	}),
	replaceKeepOut: op({
		method: 'PUT',
		path: '/api/keep-outs/{id}',
		summary: 'A new version of a keep-out; moves made before keep theirs',
		access: 'reviewer',
		subject: 'keepOut',
		body: s.keepOutReplace,
		status: 200,
		answer: s.keepOut
	}),
	removeKeepOut: op({
		method: 'DELETE',
		path: '/api/keep-outs/{id}',
		summary: 'Put a keep-out away; its history stays',
		access: 'reviewer',
		subject: 'keepOut',
		status: 200,
		answer: s.keepOut
	}),
	restoreKeepOut: op({
		method: 'POST',
		path: '/api/keep-outs/{id}/restore',
		summary: 'Bring a keep-out back',
		access: 'reviewer',
		subject: 'keepOut',
		status: 200,
		answer: s.keepOut
	}),
	importKeepOut: op({
		method: 'POST',
		path: '/api/studies/{id}/keep-outs/mesh',
		summary: 'Upload a closed surface as keep-out',
		access: 'reviewer',
		subject: 'study',
		query: s.keepOutImportQuery,
		body: 'bytes',
		status: 202,
		answer: s.jobAccepted
	}),
	getKeepOutMesh: op({
		method: 'GET',
		path: '/api/keep-outs/{id}/mesh',
		summary:
			'An uploaded keep-out’s surface: uint32 vertices, uint32 triangles, float32 positions in the study’s unit, uint32 corners',
		access: 'viewer',
		subject: 'keepOut',
		status: 200,
		answer: 'bytes'
	}),
	createLock: op({
		method: 'POST',
		path: '/api/studies/{id}/locks',
		summary: 'Add a lock',
		access: 'engineer',
		subject: 'study',
		body: s.lockCreate,
		status: 201,
		answer: s.lock
	}),
	replaceLock: op({
		method: 'PUT',
		path: '/api/locks/{id}',
		summary: 'A new version of a lock; moves made before keep theirs',
		access: 'engineer',
		subject: 'lock',
		body: s.lockReplace,
		status: 200,
		answer: s.lock
	}),
	removeLock: op({
		method: 'DELETE',
		path: '/api/locks/{id}',
		summary: 'Put a lock away; its history stays',
		access: 'engineer',
		subject: 'lock',
		status: 200,
		answer: s.lock
	}),
	restoreLock: op({
		method: 'POST',
		path: '/api/locks/{id}/restore',
		summary: 'Bring a lock back',
		access: 'engineer',
		subject: 'lock',
		status: 200,
		answer: s.lock
	}),

	listShapes: op({
		method: 'GET',
		path: '/api/studies/{id}/shapes',
		summary: 'All shapes of a study, by number',
		access: 'viewer',
		subject: 'study',
		status: 200,
		answer: z.array(s.shapeSummary)
	}),
	importShape: op({
		method: 'POST',
		path: '/api/studies/{id}/shapes',
		summary: 'Upload a surface (STL); the job’s result is {shapeId}',
		access: 'engineer',
		subject: 'study',
		query: s.shapeImportQuery,
		body: 'bytes',
		status: 202,
		answer: s.jobAccepted
	}),
	getShape: op({
		method: 'GET',
		path: '/api/shapes/{id}',
		summary: 'A shape',
		access: 'viewer',
		subject: 'shape',
		status: 200,
		answer: s.shape
	}),
	getPositions: op({
		method: 'GET',
		path: '/api/shapes/{id}/positions',
		summary: 'Vertices: float32 x, y, z little-endian, in the study’s length unit',
		access: 'viewer',
		subject: 'shape',
		status: 200,
		answer: 'bytes'
	}),
	getTriangles: op({
		method: 'GET',
		path: '/api/topologies/{id}/triangles',
		summary: 'Triangles: three uint32 vertex numbers each, little-endian, counter-clockwise from outside',
		access: 'viewer',
		subject: 'topology',
		status: 200,
		answer: 'bytes'
	}),
	getOriginal: op({
		method: 'GET',
		path: '/api/shapes/{id}/files/original',
		summary: 'The upload, byte for byte',
		access: 'viewer',
		subject: 'shape',
		status: 200,
		answer: 'bytes'
	}),
	getStl: op({
		method: 'GET',
		path: '/api/shapes/{id}/files/stl',
		summary: 'The shape as STL, in the study’s length unit',
		access: 'viewer',
		subject: 'shape',
		query: s.stlQuery,
		status: 200,
		answer: 'bytes'
	}),
	getHandover: op({
		method: 'GET',
		path: '/api/shapes/{id}/files/handover',
		summary: 'A zip for the solver: the STL, the recipe and a readable account of the move',
		access: 'viewer',
		subject: 'shape',
		status: 200,
		answer: 'bytes'
	}),

	importMap: op({
		method: 'POST',
		path: '/api/shapes/{id}/sensitivities',
		summary: 'Upload a sensitivity map (CSV: x,y,z,sensitivity or x,y,z,gx,gy,gz)',
		access: 'engineer',
		subject: 'shape',
		query: s.mapImportQuery,
		body: 'bytes',
		status: 202,
		answer: s.jobAccepted
	}),
	getMapValues: op({
		method: 'GET',
		path: '/api/maps/{id}/values',
		summary: 'The map as a density at vertices, for display: float32 little-endian, per metre outward per square metre',
		access: 'viewer',
		subject: 'map',
		status: 200,
		answer: 'bytes'
	}),

	previewMove: op({
		method: 'POST',
		path: '/api/shapes/{id}/moves/preview',
		summary: 'What a move would do',
		access: 'viewer',
		subject: 'shape',
		body: s.recipeRequest,
		status: 200,
		answer: s.moveAnswer
	}),
	commitMove: op({
		method: 'POST',
		path: '/api/shapes/{id}/moves',
		summary: 'Make the move: the job’s result is the new shape and what the preview answers',
		access: 'engineer',
		subject: 'shape',
		body: s.moveRequest,
		status: 202,
		answer: s.jobAccepted
	}),

	rehearse: op({
		method: 'POST',
		path: '/api/shapes/{id}/rehearsals',
		summary: 'Compute the rehearsal objectives of a shape: a result and a map each, marked as rehearsed',
		access: 'engineer',
		subject: 'shape',
		body: s.rehearsalRequest,
		status: 202,
		answer: s.jobAccepted
	}),
	createResult: op({
		method: 'POST',
		path: '/api/shapes/{id}/results',
		summary: 'What the solver found; a correction is a new row',
		access: 'engineer',
		subject: 'shape',
		body: s.resultCreate,
		status: 201,
		answer: s.result
	}),

	getJob: op({
		method: 'GET',
		path: '/api/jobs/{id}',
		summary: 'A job',
		access: 'viewer',
		subject: 'job',
		status: 200,
		answer: s.job
	}),
	watchJob: op({
		method: 'GET',
		path: '/api/jobs/{id}/events',
		summary: 'A job’s progress as server-sent events: each `data` is the job',
		access: 'viewer',
		subject: 'job',
		status: 200,
		answer: 'events'
	}),
	cancelJob: op({
		method: 'POST',
		path: '/api/jobs/{id}/cancel',
		summary: 'Stop a job; nothing of it stays',
		access: 'engineer',
		subject: 'job',
		status: 200,
		answer: s.job
	}),

	listTokens: op({
		method: 'GET',
		path: '/api/tokens',
		summary: 'Your API tokens (an admin sees everyone’s)',
		access: 'user',
		subject: 'none',
		status: 200,
		answer: z.array(s.token)
	}),
	createToken: op({
		method: 'POST',
		path: '/api/tokens',
		summary: 'Make an API token',
		access: 'user',
		subject: 'none',
		body: s.tokenCreate,
		status: 201,
		answer: s.tokenCreated
	}),
	revokeToken: op({
		method: 'DELETE',
		path: '/api/tokens/{id}',
		summary: 'Revoke an API token',
		access: 'user',
		subject: 'token',
		status: 200,
		answer: s.token
	}),

	listUsers: op({
		method: 'GET',
		path: '/api/users',
		summary: 'Everyone',
		access: 'admin',
		subject: 'none',
		status: 200,
		answer: z.array(s.user)
	}),
	createUser: op({
		method: 'POST',
		path: '/api/users',
		summary: 'Add a person',
		access: 'admin',
		subject: 'none',
		body: s.userCreate,
		status: 201,
		answer: s.user
	}),
	updateUser: op({
		method: 'PATCH',
		path: '/api/users/{id}',
		summary: 'Change a person’s name, password, admin right, or whether they may sign in',
		access: 'admin',
		subject: 'user',
		body: s.userUpdate,
		status: 200,
		answer: s.user
	})
} satisfies Record<string, Operation>;

export type OperationName = keyof typeof operations;
