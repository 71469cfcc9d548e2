import { existsSync, readFileSync, readdirSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { basename, dirname, join } from 'node:path';
import { runningServer } from './cluster.mjs';
import { endProcess, isAlive } from './processes.mjs';
import { note } from './say.mjs';

/**
 * Ends whatever still runs on a test run's temporary folder and removes it. Runs that end well leave nothing to do; a test
 * process that was killed leaves its PostgreSQL.
 * @param {string} folder nothing happens unless it is a folder that the tests made
 */
export async function sweep(folder) {
	if (!folder || dirname(folder) !== tmpdir() || !basename(folder).startsWith('planish-test-')) return;
	if (!existsSync(folder)) return;
	for (const name of readdirSync(folder)) {
		const data = join(folder, name);
		const server = readIdentity(join(data, 'run', 'server.json'));
		if (server && isAlive(server)) {
			note(`Ending a server left by the tests (process ${server.pid}).`);
			await endProcess(server, { seconds: 10 });
		}
		const home = readIdentity(join(data, 'postgres.json'))?.home ?? join(data, 'postgres');
		const postgres = runningServer({ folder: join(home, 'cluster') });
		if (postgres) {
			note(`Ending a PostgreSQL left by the tests (process ${postgres.identity.pid}).`);
			// SIGINT is PostgreSQL's fast shutdown.
			await endProcess(postgres.identity, { signal: 'SIGINT', seconds: 20 });
		}
	}
	rmSync(folder, { recursive: true, force: true });
}

/**
 * @param {string} path
 * @returns {any}
 */
function readIdentity(path) {
	return existsSync(path) ? JSON.parse(readFileSync(path, 'utf8')) : null;
}
