/** People, members of studies and tokens on the wire. */
import { z } from 'zod';
import { id, timestamp, role, person } from './common';
import { name } from './primitives';

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
