/** Our tables against Auth.js's own Sequelize adapter (npm @auth/sequelize-adapter): what it writes it reads back. */
import { randomUUID } from 'node:crypto';
import SequelizeAdapter from '@auth/sequelize-adapter';
import { afterAll, beforeAll, describe, expect, inject, it } from 'vitest';
import { closeDatabase, database } from '../../src/lib/server/db/client';
import { AccountModel, SessionModel, VerificationTokenModel } from '../../src/lib/server/db/models/auth';
import { UserModel } from '../../src/lib/server/db/models/people';
import { createDatabase, dropDatabase } from '../harness/postgres';

let url: string;
let adapter: Required<ReturnType<typeof SequelizeAdapter>>;

beforeAll(async () => {
	url = await createDatabase(inject('postgresUrl'));
	process.env.DATABASE_URL = url;
	const models = {
		User: UserModel,
		Account: AccountModel,
		Session: SessionModel,
		VerificationToken: VerificationTokenModel
	};
	// Its types know its own models only; ours have more columns.
	const options = { synchronize: false, models } as unknown as Parameters<typeof SequelizeAdapter>[1];
	adapter = SequelizeAdapter(database(), options) as typeof adapter;
});

afterAll(async () => {
	await closeDatabase();
	await dropDatabase(inject('postgresUrl'), url);
});

// Auth.js gives an id of its own making to an adapter, or none.
const person = (email: string) =>
	adapter.createUser({ id: randomUUID(), email, name: 'Provider Person', emailVerified: null });

describe('Auth.js’s adapter', () => {
	it('finds a person by an account at a provider, until it is unlinked', async () => {
		const { id } = await person('account@planish.example');
		const account = { provider: 'oidc', providerAccountId: '4711' };
		await adapter.linkAccount({ ...account, userId: id, type: 'oidc', access_token: 'a', expires_at: 1_900_000_000 });
		expect((await adapter.getUserByAccount(account))?.email).toBe('account@planish.example');
		await adapter.unlinkAccount(account);
		expect(await adapter.getUserByAccount(account)).toBeNull();
	});

	it('keeps a session with its person, moves its end, and ends it', async () => {
		const { id } = await person('session@planish.example');
		const sessionToken = 'session-1';
		await adapter.createSession({ sessionToken, userId: id, expires: new Date('2030-01-01') });
		expect((await adapter.getSessionAndUser(sessionToken))?.user.id).toBe(id);
		await adapter.updateSession({ sessionToken, expires: new Date('2031-01-01') });
		expect((await adapter.getSessionAndUser(sessionToken))?.session.expires).toEqual(new Date('2031-01-01'));
		await adapter.deleteSession(sessionToken);
		expect(await adapter.getSessionAndUser(sessionToken)).toBeNull();
	});

	it('takes a verification token once', async () => {
		const given = { identifier: 'mail@planish.example', token: 'hashed', expires: new Date('2030-01-01') };
		await adapter.createVerificationToken(given);
		expect(await adapter.useVerificationToken({ identifier: given.identifier, token: 'hashed' })).toMatchObject(given);
		expect(await adapter.useVerificationToken({ identifier: given.identifier, token: 'hashed' })).toBeNull();
	});
});
