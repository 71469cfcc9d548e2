/** The contract’s rows of people, members of studies and tokens. */
import { z } from 'zod';
import { member, memberPut, token, tokenCreate, tokenCreated, user, userCreate, userUpdate } from '../schemas/people';
import { op, type Operation } from './operation';

export const peopleOperations = {
	listMembers: op({
		method: 'GET',
		path: '/api/studies/{id}/members',
		summary: 'People of a study',
		access: 'viewer',
		subject: 'study',
		status: 200,
		answer: z.array(member)
	}),
	putMember: op({
		method: 'PUT',
		path: '/api/studies/{id}/members',
		summary: 'Add a person by e-mail, or change their role',
		access: 'engineer',
		subject: 'study',
		body: memberPut,
		status: 200,
		answer: z.array(member)
	}),
	removeMember: op({
		method: 'DELETE',
		path: '/api/studies/{id}/members/{userId}',
		summary: 'Take a person out of a study; its last engineer stays',
		access: 'engineer',
		subject: 'study',
		status: 200,
		answer: z.array(member)
	}),
	listTokens: op({
		method: 'GET',
		path: '/api/tokens',
		summary: 'Your API tokens (an admin sees everyone’s)',
		access: 'user',
		subject: 'none',
		status: 200,
		answer: z.array(token)
	}),
	createToken: op({
		method: 'POST',
		path: '/api/tokens',
		summary: 'Make an API token',
		access: 'user',
		subject: 'none',
		body: tokenCreate,
		status: 201,
		answer: tokenCreated
	}),
	revokeToken: op({
		method: 'DELETE',
		path: '/api/tokens/{id}',
		summary: 'Revoke an API token',
		access: 'user',
		subject: 'token',
		status: 200,
		answer: token
	}),
	listUsers: op({
		method: 'GET',
		path: '/api/users',
		summary: 'Everyone',
		access: 'admin',
		subject: 'none',
		status: 200,
		answer: z.array(user)
	}),
	createUser: op({
		method: 'POST',
		path: '/api/users',
		summary: 'Add a person',
		access: 'admin',
		subject: 'none',
		body: userCreate,
		status: 201,
		answer: user
	}),
	updateUser: op({
		method: 'PATCH',
		path: '/api/users/{id}',
		summary: 'Change a person’s name, password, admin right, or whether they may sign in',
		access: 'admin',
		subject: 'user',
		body: userUpdate,
		status: 200,
		answer: user
	})
} satisfies Record<string, Operation>;
