// The built application: its environment, its preparation and its server process.
import { spawn } from 'node:child_process';
import { createHash, randomBytes } from 'node:crypto';
import { createWriteStream, existsSync, readFileSync, renameSync, rmSync, statSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { setTimeout as sleep } from 'node:timers/promises';
import { readHolder } from './lock.mjs';
import { endProcess, identify, isAlive, must } from './processes.mjs';
import { Trouble, lastLines, note } from './say.mjs';
import { ROOT, dataFolder } from './settings.mjs';

const PARENT_WATCH = join(ROOT, 'scripts', 'lib', 'end-with-parent.mjs');
const LOG_LIMIT = 20_000_000;

/**
 * The secret that signs sessions, kept in the data folder so that a restart signs nobody out.
 * @param {string} data
 */
function authSecret(data) {
	const path = join(data, 'auth-secret');
	if (!existsSync(path)) writeFileSync(path, randomBytes(32).toString('base64url'), { mode: 0o600, flag: 'wx' });
	return readFileSync(path, 'utf8').trim();
}

/**
 * What the application's programs find in their environment.
 * @param {import('./settings.mjs').Settings} settings
 * @param {string} databaseUrl
 * @param {NodeJS.ProcessEnv} [env] what the person set
 * @returns {NodeJS.ProcessEnv}
 */
export function appEnvironment({ host, port, origin, data }, databaseUrl, env = process.env) {
	dataFolder(data);
	const given = Object.fromEntries(Object.entries(env).filter(([, value]) => value));
	return {
		AUTH_TRUST_HOST: 'true',
		// The routes limit what they read; the adapter's own limit would cut uploads at 512 kB.
		BODY_SIZE_LIMIT: 'Infinity',
		PLANISH_WORKER_DIR: join(ROOT, 'build', 'workers'),
		SHUTDOWN_TIMEOUT: '10',
		...given,
		AUTH_SECRET: env.AUTH_SECRET || authSecret(data),
		NODE_ENV: 'production',
		HOST: host,
		PORT: String(port),
		ORIGIN: origin,
		PLANISH_DATA: data,
		DATABASE_URL: databaseUrl
	};
}

/**
 * Runs one of the application's commands (build/cli/NAME.mjs) to its end.
 * @param {string} name
 * @param {NodeJS.ProcessEnv} env
 * @param {{ args?: string[], folder?: string, what: string, show?: boolean }} options what: the sentence for a failure
 */
export async function runCommand(name, env, { args = [], folder = join(ROOT, 'build', 'cli'), what, show }) {
	const path = join(folder, `${name}.mjs`);
	if (!existsSync(path)) throw new Trouble(`${path} is missing: src/cli/${name}.ts was not built.`);
	return must(what, process.execPath, ['--enable-source-maps', path, ...args], {
		cwd: ROOT,
		env,
		show: show ? 'stderr' : undefined
	});
}

/**
 * Brings the database's tables up to date, and at the first start brings the demo in. PLANISH_DEMO=none leaves it out.
 * @param {import('./settings.mjs').Settings} settings
 * @param {NodeJS.ProcessEnv} env
 * @param {string} [folder] where the bundled commands are
 */
export async function prepareDatabase({ data }, env, folder) {
	await runCommand('migrate', env, { folder, what: 'The database could not be brought up to date' });
	if (env.PLANISH_DEMO === 'none') return;
	// Another database in the same data folder has no demo yet.
	const database = new URL(env.DATABASE_URL ?? '');
	const name = createHash('sha256').update(`${database.hostname}/${database.pathname}`).digest('hex');
	const marker = join(data, 'demo-database');
	if (existsSync(join(data, 'demo.json')) && existsSync(marker) && readFileSync(marker, 'utf8') === name) return;
	note('Loading the demo ...');
	await runCommand('demo', env, { folder, what: 'The demo could not be loaded', show: true });
	writeFileSync(marker, name);
}

/**
 * The demo's sign-ins, as the demo command left them.
 * @param {string} data
 * @returns {{ role: string, email: string, password: string }[]}
 */
export function demoAccounts(data) {
	const path = join(data, 'demo.json');
	return existsSync(path) ? JSON.parse(readFileSync(path, 'utf8')).users : [];
}

/**
 * @typedef {object} Server
 * @property {number} pid
 * @property {string} log
 * @property {Promise<string>} ended how it ended, in words
 * @property {() => Promise<boolean>} stop lets it finish what it does for some seconds; whether it ended by itself
 * @property {() => string} lastWords the end of its output
 */

/**
 * Starts the built server and waits until it can serve.
 * @param {string} url
 * @param {string} data
 * @param {NodeJS.ProcessEnv} env
 * @param {Promise<unknown>} [stopping] gives the waiting up when it resolves
 * @returns {Promise<Server>}
 */
export async function startServer(url, data, env, stopping = new Promise(() => {})) {
	const log = join(dataFolder(data, 'logs'), 'server.log');
	if (existsSync(log) && statSync(log).size > LOG_LIMIT) renameSync(log, `${log}.1`);
	const record = join(dataFolder(data, 'run'), 'server.json');
	const args = ['--enable-source-maps', '--import', PARENT_WATCH, join(ROOT, 'build', 'index.js')];
	// Its own process group: Ctrl-C reaches it through us. The channel tells it when we are gone.
	const child = spawn(process.execPath, args, {
		cwd: ROOT,
		env,
		detached: true,
		stdio: ['ignore', 'pipe', 'pipe', 'ipc']
	});
	const file = createWriteStream(log, { flags: 'a', mode: 0o600 });
	let tail = '';
	for (const stream of [child.stdout, child.stderr]) {
		stream?.on('data', (bytes) => {
			file.write(bytes);
			tail = (tail + bytes).slice(-8000);
		});
	}
	const ended = new Promise((resolve) => {
		child.on('error', (error) => resolve(`could not be run: ${error.message}`));
		child.on('close', (code, signal) => {
			file.end();
			rmSync(record, { force: true });
			resolve(signal ? `was ended by ${signal}` : `ended with exit code ${code}`);
		});
	});
	const identity = child.pid ? identify(child.pid) : null;
	if (identity) writeFileSync(record, JSON.stringify(identity), { mode: 0o600 });
	const server = {
		pid: child.pid ?? 0,
		log,
		ended,
		stop: async () => !identity || endProcess(identity, { seconds: 20 }),
		lastWords: () => lastLines(tail, 20)
	};
	const failure = await Promise.race([
		ended,
		stopping.then(() => 'was asked to stop'),
		untilHealthy(url, 90).then((healthy) => (healthy ? null : 'does not answer'))
	]);
	if (failure === null) return server;
	await server.stop();
	throw new Trouble(`The server ${failure}. The end of its log, ${log}:\n\n${server.lastWords()}`);
}

/**
 * Ends the server of a start command that was killed, if it still runs.
 * @param {string} data
 */
export async function endOrphan(data) {
	const record = join(dataFolder(data, 'run'), 'server.json');
	const orphan = readHolder(record);
	if (orphan && isAlive(orphan)) {
		note(`Ending the server that an interrupted start left behind (process ${orphan.pid}).`);
		await endProcess(orphan, { seconds: 20 });
	}
	rmSync(record, { force: true });
}

/**
 * @param {string} url
 * @param {number} seconds
 */
export async function untilHealthy(url, seconds) {
	for (const until = Date.now() + seconds * 1000; Date.now() < until; await sleep(100)) {
		try {
			const answer = await fetch(`${url}/api/health`, { signal: AbortSignal.timeout(5000) });
			if (answer.ok && (await answer.json()).status === 'ok') return true;
		} catch {
			// Not yet.
		}
	}
	return false;
}
