import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import * as wire from '$lib/api/schemas/people';
import type { Token, User } from '$lib/api/schemas/people';
import type { Study } from '$lib/api/schemas/studies';
import { call, newScene, ok, problemIn } from '../factories/scene';
import { startServer, type TestServer, type TestUser } from '../harness/server';

let server: TestServer;
let admin: TestUser;
beforeAll(async () => {
	server = await startServer();
	admin = await server.addUser({ admin: true });
});
afterAll(() => server.stop());

type Made = Token & { token: string };

describe('API tokens', () => {
	it('are made, shown once, listed by prefix, and stop working when revoked', async () => {
		const person = await server.addUser();
		const made = await ok<Made>(server, person.token, 'POST', '/api/tokens', { name: 'Solver pipeline' });
		expect(wire.tokenCreated.parse(made)).toEqual(made);
		expect(made.token.startsWith(made.prefix)).toBe(true);
		expect(made.prefix.length).toBeLessThan(made.token.length / 2);
		await ok(server, made.token, 'GET', '/api/studies');
		const list = await ok<Token[]>(server, person.token, 'GET', '/api/tokens');
		const listed = list.find(({ id }) => id === made.id)!;
		expect(listed).toMatchObject({ name: 'Solver pipeline', studyId: null, revokedAt: null });
		expect(listed.lastUsedAt).not.toBeNull();
		expect(JSON.stringify(list)).not.toContain(made.token);
		// Only a hash is kept.
		const kept = JSON.stringify(await server.query('SELECT * FROM api_tokens WHERE id = $1', [made.id]));
		expect(kept).not.toContain(made.token);

		await ok(server, person.token, 'DELETE', `/api/tokens/${made.id}`);
		problemIn(await call(server, made.token, 'GET', '/api/studies'), 401, 'unauthenticated');
	});

	it('that are made for one study touch no other', async () => {
		const one = await newScene(server);
		const other = await ok<Study>(server, one.token, 'POST', '/api/studies', { name: 'Other', lengthUnit: 'm' });
		const { token } = await ok<Made>(server, one.token, 'POST', '/api/tokens', {
			name: 'One study',
			studyId: one.study.id
		});
		expect((await ok<Study>(server, token, 'GET', `/api/studies/${one.study.id}`)).id).toBe(one.study.id);
		problemIn(await call(server, token, 'GET', `/api/studies/${other.id}`), 404, 'not-found');
		const listed = await ok<Study[]>(server, token, 'GET', '/api/studies');
		expect(listed.map(({ id }) => id)).toEqual([one.study.id]);
		// Nor may it reach further than itself: no new study, no wider token.
		const wider = await call(server, token, 'POST', '/api/tokens', { name: 'Wider' });
		problemIn(wider, 403, 'forbidden');
		problemIn(await call(server, token, 'POST', '/api/studies', { name: 'New', lengthUnit: 'm' }), 403, 'forbidden');
	});

	it('that an admin makes for one study carry no admin right', async () => {
		const study = await ok<Study>(server, admin.token, 'POST', '/api/studies', { name: 'Mine', lengthUnit: 'm' });
		const { token } = await ok<Made>(server, admin.token, 'POST', '/api/tokens', { name: 'x', studyId: study.id });
		problemIn(await call(server, token, 'GET', '/api/users'), 403, 'forbidden');
	});

	it('can’t be made for a study without a part in it, nor revoked by another person', async () => {
		const { study, token, engineer } = await newScene(server);
		const stranger = await server.addUser();
		const answer = await call(server, stranger.token, 'POST', '/api/tokens', { name: 'x', studyId: study.id });
		expect([404, 422]).toContain(problemIn(answer, answer.status).status);
		const [own] = await ok<Token[]>(server, token, 'GET', '/api/tokens');
		expect(own.owner.id).toBe(engineer.id);
		problemIn(await call(server, stranger.token, 'DELETE', `/api/tokens/${own.id}`), 404, 'not-found');
		const all = await ok<Token[]>(server, admin.token, 'GET', '/api/tokens');
		expect(all.map(({ id }) => id)).toContain(own.id);
		await ok(server, admin.token, 'DELETE', `/api/tokens/${own.id}`);
		problemIn(await call(server, token, 'GET', '/api/studies'), 401);
	});

	it('come from the command line as its last line, also for one study', async () => {
		const { study, engineer } = await newScene(server);
		const token = await server.token(engineer.email, study.id);
		expect((await ok<Study>(server, token, 'GET', `/api/studies/${study.id}`)).role).toBe('engineer');
		await expect(server.token('nobody@planish.test')).rejects.toThrow(/nobody@planish\.test/);
	});
});

describe('people', () => {
	it('are added, renamed and shut out by an admin', async () => {
		const email = 'new.person@planish.test';
		const made = await ok<User>(server, admin.token, 'POST', '/api/users', {
			email: 'New.Person@planish.test',
			name: 'New Person',
			password: 'a password of some length'
		});
		expect(made).toMatchObject({ email, isAdmin: false, active: true });
		expect(JSON.stringify(made)).not.toMatch(/argon|password/i);
		const [{ password_hash: hash }] = await server.query<{ password_hash: string }>(
			'SELECT password_hash FROM users WHERE id = $1',
			[made.id]
		);
		// PHC string format of argon2id.
		expect(hash).toMatch(/^\$argon2id\$v=19\$/);

		const token = await server.token(email);
		await ok(server, token, 'GET', '/api/studies');
		await ok<User>(server, admin.token, 'PATCH', `/api/users/${made.id}`, { name: 'Renamed' });
		await ok<User>(server, admin.token, 'PATCH', `/api/users/${made.id}`, { active: false });
		problemIn(await call(server, token, 'GET', '/api/studies'), 401);
		const all = await ok<User[]>(server, admin.token, 'GET', '/api/users');
		expect(all.find(({ id }) => id === made.id)).toMatchObject({ name: 'Renamed', active: false });
	});

	it('are not added twice, nor with a weak password', async () => {
		const again = await call(server, admin.token, 'POST', '/api/users', {
			email: admin.email,
			name: 'Twin',
			password: 'a password of some length'
		});
		expect([409, 422]).toContain(problemIn(again, again.status).status);
		const weak = await call(server, admin.token, 'POST', '/api/users', { email: 'a@b', name: '', password: 'short' });
		expect(
			problemIn(weak, 422, 'invalid')
				.errors?.map(({ pointer }) => pointer)
				.sort()
		).toEqual(['/email', '/name', '/password']);
	});

	it('always leave one active admin', async () => {
		const others = await ok<User[]>(server, admin.token, 'GET', '/api/users');
		expect(others.filter(({ isAdmin, active }) => isAdmin && active)).toHaveLength(1);
		problemIn(await call(server, admin.token, 'PATCH', `/api/users/${admin.id}`, { isAdmin: false }), 409, 'conflict');
		problemIn(await call(server, admin.token, 'PATCH', `/api/users/${admin.id}`, { active: false }), 409, 'conflict');
	});
});

describe('sign-in', () => {
	/** Sends the sign-in page's form, as a browser without scripts does, and returns the cookies that it sets. */
	async function signIn(email: string, password: string): Promise<{ cookies: string; status: number }> {
		const response = await server.fetch('/sign-in', {
			method: 'POST',
			redirect: 'manual',
			headers: { accept: 'text/html', origin: server.baseUrl, 'content-type': 'application/x-www-form-urlencoded' },
			body: new URLSearchParams({ email, password })
		});
		const cookies = response.headers.getSetCookie().map((cookie) => cookie.split(';')[0]);
		return { cookies: cookies.join('; '), status: response.status };
	}

	it('gives a session to the right password only, and ends it when the password changes', async () => {
		const person = await server.addUser();
		const wrong = await signIn(person.email, 'not the password at all');
		expect(wrong.status).toBe(400);
		const none = await server.fetch('/api/studies', { headers: { cookie: wrong.cookies } });
		expect(none.status).toBe(401);
		const { cookies, status } = await signIn(person.email, person.password);
		expect(status).toBe(303);
		const answer = await server.fetch('/api/studies', { headers: { cookie: cookies } });
		expect(answer.status).toBe(200);
		await ok(server, admin.token, 'PATCH', `/api/users/${person.id}`, { password: 'another long password' });
		expect((await server.fetch('/api/studies', { headers: { cookie: cookies } })).status).toBe(401);
	});

	it('lets no other site write with a session’s cookie', async () => {
		const person = await server.addUser();
		const { cookies } = await signIn(person.email, person.password);
		const before = await server.query('SELECT 1 FROM studies');
		const response = await server.fetch('/api/studies', {
			headers: { cookie: cookies, origin: 'https://elsewhere.example' },
			json: { name: 'Forged', lengthUnit: 'm' }
		});
		expect(response.status).toBe(403);
		expect(await server.query('SELECT 1 FROM studies')).toHaveLength(before.length);
	});
});
