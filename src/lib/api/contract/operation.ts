/** What a row of the contract says. */
import type { z } from 'zod';

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

export const op = <const O extends Operation>(o: O) => o;
