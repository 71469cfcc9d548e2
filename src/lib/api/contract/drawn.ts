/** The contract’s rows of what people draw: design boxes, keep-outs, locks. */
import {
	box,
	boxCreate,
	boxReplace,
	keepOut,
	keepOutCreate,
	keepOutImportQuery,
	keepOutReplace,
	lock,
	lockCreate,
	lockReplace
} from '../schemas/drawn';
import { jobAccepted } from '../schemas/jobs';
import { op, type Operation } from './operation';

export const drawnOperations = {
	createBox: op({
		method: 'POST',
		path: '/api/studies/{id}/boxes',
		summary: 'Add a design box',
		access: 'engineer',
		subject: 'study',
		body: boxCreate,
		status: 201,
		answer: box
	}),
	replaceBox: op({
		method: 'PUT',
		path: '/api/boxes/{id}',
		summary: 'A new version of a design box; moves made before keep theirs',
		access: 'engineer',
		subject: 'box',
		body: boxReplace,
		status: 200,
		answer: box
	}),
	removeBox: op({
		method: 'DELETE',
		path: '/api/boxes/{id}',
		summary: 'Put a design box away; its history stays',
		access: 'engineer',
		subject: 'box',
		status: 200,
		answer: box
	}),
	restoreBox: op({
		method: 'POST',
		path: '/api/boxes/{id}/restore',
		summary: 'Bring a design box back',
		access: 'engineer',
		subject: 'box',
		status: 200,
		answer: box
	}),
	createKeepOut: op({
		method: 'POST',
		path: '/api/studies/{id}/keep-outs',
		summary: 'Add a keep-out',
		access: 'reviewer',
		subject: 'study',
		body: keepOutCreate,
		status: 201,
		answer: keepOut
	}),
	replaceKeepOut: op({
		method: 'PUT',
		path: '/api/keep-outs/{id}',
		summary: 'A new version of a keep-out; moves made before keep theirs',
		access: 'reviewer',
		subject: 'keepOut',
		body: keepOutReplace,
		status: 200,
		answer: keepOut
	}),
	removeKeepOut: op({
		method: 'DELETE',
		path: '/api/keep-outs/{id}',
		summary: 'Put a keep-out away; its history stays',
		access: 'reviewer',
		subject: 'keepOut',
		status: 200,
		answer: keepOut
	}),
	restoreKeepOut: op({
		method: 'POST',
		path: '/api/keep-outs/{id}/restore',
		summary: 'Bring a keep-out back',
		access: 'reviewer',
		subject: 'keepOut',
		status: 200,
		answer: keepOut
	}),
	importKeepOut: op({
		method: 'POST',
		path: '/api/studies/{id}/keep-outs/mesh',
		summary: 'Upload a closed surface as keep-out',
		access: 'reviewer',
		subject: 'study',
		query: keepOutImportQuery,
		body: 'bytes',
		status: 202,
		answer: jobAccepted
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
		body: lockCreate,
		status: 201,
		answer: lock
	}),
	replaceLock: op({
		method: 'PUT',
		path: '/api/locks/{id}',
		summary: 'A new version of a lock; moves made before keep theirs',
		access: 'engineer',
		subject: 'lock',
		body: lockReplace,
		status: 200,
		answer: lock
	}),
	removeLock: op({
		method: 'DELETE',
		path: '/api/locks/{id}',
		summary: 'Put a lock away; its history stays',
		access: 'engineer',
		subject: 'lock',
		status: 200,
		answer: lock
	}),
	restoreLock: op({
		method: 'POST',
		path: '/api/locks/{id}/restore',
		summary: 'Bring a lock back',
		access: 'engineer',
		subject: 'lock',
		status: 200,
		answer: lock
	})
} satisfies Record<string, Operation>;
