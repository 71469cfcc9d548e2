/**
 * Loads the demo into an empty installation, and leaves its sign-ins in demo.json of the data folder for the start command. Does
 * nothing in one that holds studies.
 */
import { mkdirSync, renameSync, writeFileSync } from 'node:fs';
import { join, resolve } from 'node:path';
import { closeDatabase, database } from '$lib/server/db/client';
import { loadDemo } from '$lib/server/demo/load';
import { startJobs, stopJobs } from '$lib/server/jobs/runtime';
import { explain } from './shared/explain';

function leaveSignIns(people: { role: string; email: string; password: string }[]): void {
	const folder = resolve(process.env.PLANISH_DATA ?? 'data');
	mkdirSync(folder, { recursive: true });
	const users = people.map(({ role, email, password }) => ({ role, email, password }));
	const path = join(folder, 'demo.json');
	// Whole or not at all: the start command takes the file for the sign that the demo is loaded.
	writeFileSync(`${path}.part`, `${JSON.stringify({ users }, null, '\t')}\n`, { mode: 0o600 });
	renameSync(`${path}.part`, path);
}

try {
	await database().authenticate();
	await startJobs();
	leaveSignIns(await loadDemo((sentence) => console.error(sentence)));
} catch (thrown) {
	process.exitCode = explain(thrown, 'node build/cli/demo.mjs');
} finally {
	await stopJobs();
	await closeDatabase();
}
