import { mkdirSync } from 'node:fs';
import { join } from 'node:path';
import { randomBytes } from 'node:crypto';
import { hash } from '@node-rs/argon2';
import { inject } from 'vitest';
import { appEnvironment, demoAccounts, runCommand, startServer as spawnServer } from '../../scripts/lib/app.mjs';
import { freePort } from '../../scripts/lib/ports.mjs';
import { ROOT, readSettings } from '../../scripts/lib/settings.mjs';
import { newToken } from '$lib/server/auth/bearer';
import { createDatabase, dropDatabase, execute } from './postgres';

export interface TestUser {
	id: string;
	email: string;
	password: string;
	/** A bearer token of theirs, for every study they are a member of. */
	token: string;
}

export interface TestServer {
	/** Such as http://127.0.0.1:23456, no slash at the end. */
	baseUrl: string;
	databaseUrl: string;
	/** Its data folder (PLANISH_DATA); the log is logs/server.log in it. */
	data: string;
	/** fetch() on a path of this server, with a bearer token; `json` is sent as a JSON body (POST unless said otherwise). */
	fetch(path: string, init?: RequestInit & { token?: string; json?: unknown }): Promise<Response>;
	/** Adds a person straight to the database (no study: membership goes through the API) with a token for them. */
	addUser(user?: { email?: string; name?: string; admin?: boolean; password?: string }): Promise<TestUser>;
	/** Prints a token as `npm run token -- --email E [--study ID]` does. */
	token(email: string, study?: string): Promise<string>;
	/** The demo's people; only with `demo: true`. */
	demoUsers(): { role: string; email: string; password: string }[];
	/** One statement on this server's database, with $1, $2 for the values. */
	query<Row = Record<string, unknown>>(sql: string, values?: unknown[]): Promise<Row[]>;
	/** Waits for the job to end and returns it as GET /api/jobs/{id} does; throws when it takes longer than `seconds` (60). */
	job<Job extends { state: string }>(id: string, token: string, seconds?: number): Promise<Job>;
	/** Ends the server with SIGKILL, as a power cut would, and starts it again on the same database and port. */
	killAndRestart(): Promise<void>;
	/** Stops the server and drops its database. */
	stop(): Promise<void>;
}

/**
 * Starts the built server (build/index.js) on a free port against a fresh, migrated database of its own.
 * Call it in beforeAll and stop() in afterAll. Needs the global set-up of the vitest project `integration`.
 * @param options.demo also loads the demo
 * @param options.env more settings for the server
 */
export async function startServer(options: { demo?: boolean; env?: Record<string, string> } = {}): Promise<TestServer> {
	const postgresUrl = inject('postgresUrl');
	const databaseUrl = await createDatabase(postgresUrl);
	const data = join(ROOT, 'test-results', 'servers', new URL(databaseUrl).pathname.slice(1));
	mkdirSync(data, { recursive: true });
	const settings = readSettings({ PORT: String(await freePort()), PLANISH_DATA: data });
	// The runner's own marks would silence the server's log.
	const inherited = { ...process.env, AUTH_SECRET: undefined, VITEST: undefined };
	const env = { ...appEnvironment(settings, databaseUrl, inherited), ...options.env };
	if (options.demo) await runCommand('demo', env, { what: 'The demo could not be loaded' });
	let server = await spawnServer(settings.url, data, env);

	const token = async (email: string, study?: string) => {
		const args = ['--email', email, ...(study ? ['--study', study] : [])];
		const printed = await runCommand('token', env, { args, what: 'No token could be made' });
		return printed.stdout.trim().split('\n').at(-1) ?? '';
	};
	const query = <Row>(sql: string, values?: unknown[]) => execute<Row>(databaseUrl, sql, values);
	const call: TestServer['fetch'] = (path, { token: bearer, json, ...init } = {}) => {
		const headers = new Headers(init.headers);
		if (bearer) headers.set('authorization', `Bearer ${bearer}`);
		if (json === undefined) return fetch(settings.url + path, { ...init, headers });
		headers.set('content-type', 'application/json');
		return fetch(settings.url + path, { method: 'POST', ...init, headers, body: JSON.stringify(json) });
	};

	return {
		baseUrl: settings.url,
		databaseUrl,
		data,
		fetch: call,
		token,
		query,
		demoUsers: () => demoAccounts(data),
		async addUser({ email, name, admin = false, password = 'correct horse battery staple' } = {}) {
			const address = email ?? `person-${randomBytes(4).toString('hex')}@planish.test`;
			const [row] = await query<{ id: string }>(
				'INSERT INTO users (email, name, password_hash, is_admin) VALUES ($1, $2, $3, $4) RETURNING id',
				[address, name ?? address.split('@')[0], await hash(password), admin]
			);
			// As the command makes it, without starting a program for each of a test's people.
			const made = newToken();
			await query('INSERT INTO api_tokens (user_id, name, prefix, hash) VALUES ($1, $2, $3, $4)', [
				row.id,
				'harness',
				made.prefix,
				made.hash
			]);
			return { id: row.id, email: address, password, token: made.token };
		},
		async job<Job extends { state: string }>(id: string, bearer: string, seconds = 60) {
			for (const until = Date.now() + seconds * 1000; ;) {
				const response = await call(`/api/jobs/${id}`, { token: bearer });
				const job = (await response.json()) as Job;
				if (!response.ok) throw new Error(`GET /api/jobs/${id}: ${response.status} ${JSON.stringify(job)}`);
				if (['done', 'failed', 'cancelled'].includes(job.state)) return job;
				if (Date.now() > until) throw new Error(`The job did not end in ${seconds} s: ${JSON.stringify(job)}`);
				await new Promise((resolve) => setTimeout(resolve, 50));
			}
		},
		async killAndRestart() {
			process.kill(server.pid, 'SIGKILL');
			await server.ended;
			server = await spawnServer(settings.url, data, env);
		},
		async stop() {
			await server.stop();
			await dropDatabase(postgresUrl, databaseUrl);
		}
	};
}
