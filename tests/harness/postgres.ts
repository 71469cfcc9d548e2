import { existsSync, mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { randomBytes } from 'node:crypto';
import { Client } from 'pg';
import { runCommand } from '../../scripts/lib/app.mjs';
import { openDatabase } from '../../scripts/lib/database.mjs';

/** The migrated, empty database that each test's own is copied from. */
const TEMPLATE = 'planish_template';

export interface TestPostgres {
	/** A superuser's connection to the database `postgres`. */
	url: string;
	stop(): Promise<void>;
}

/** Starts a PostgreSQL of the tests' own in a temporary folder (not synced: it is thrown away) with a migrated template. */
export async function startTestPostgres(): Promise<TestPostgres> {
	const folder = mkdtempSync(join(process.env.PLANISH_TEST_FOLDER ?? tmpdir(), 'planish-postgres-'));
	// Whatever DATABASE_URL says: tests never touch a database that they did not make.
	const database = await openDatabase(folder, { throwaway: true, env: {} });
	const stop = async () => {
		await database.release();
		if (existsSync(folder)) rmSync(folder, { recursive: true });
	};
	try {
		const url = withDatabase(database.url, 'postgres');
		await execute(url, `CREATE DATABASE ${TEMPLATE}`);
		await runCommand(
			'migrate',
			{ ...process.env, DATABASE_URL: withDatabase(url, TEMPLATE), PLANISH_DATA: folder },
			{ what: 'The migrations failed on the test database' }
		);
		return { url, stop };
	} catch (error) {
		await stop();
		throw error;
	}
}

/**
 * Makes a fresh migrated database.
 * @param postgresUrl as in TestPostgres.url
 * @returns the new database's URL
 */
export async function createDatabase(postgresUrl: string): Promise<string> {
	const name = `test_${randomBytes(6).toString('hex')}`;
	await execute(postgresUrl, `CREATE DATABASE ${name} TEMPLATE ${TEMPLATE}`);
	return withDatabase(postgresUrl, name);
}

/** Drops a database made by createDatabase, whoever is still connected. */
export async function dropDatabase(postgresUrl: string, databaseUrl: string): Promise<void> {
	await execute(postgresUrl, `DROP DATABASE IF EXISTS ${new URL(databaseUrl).pathname.slice(1)} WITH (FORCE)`);
}

/** Runs one statement on a connection of its own and returns its rows. */
export async function execute<Row>(url: string, sql: string, values: unknown[] = []): Promise<Row[]> {
	const client = new Client({ connectionString: url });
	await client.connect();
	try {
		return (await client.query(sql, values)).rows as Row[];
	} finally {
		await client.end();
	}
}

function withDatabase(url: string, name: string): string {
	const changed = new URL(url);
	changed.pathname = `/${name}`;
	return changed.href;
}
