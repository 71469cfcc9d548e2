// A process id alone does not name a process: ids are used again. The start time and the boot make it certain.
import { spawn } from 'node:child_process';
import { createWriteStream, readFileSync, readdirSync, readlinkSync } from 'node:fs';
import { finished } from 'node:stream/promises';
import { setTimeout as sleep } from 'node:timers/promises';
import { Trouble, lastLines } from './say.mjs';

/** @typedef {{ pid: number, started: string }} Identity */

/**
 * @param {number} pid
 * @returns {Identity | null} null when no such process lives
 */
export function identify(pid) {
	try {
		// The command's name stands in brackets and may hold spaces; state and start time are fields 3 and 22.
		const stat = readFileSync(`/proc/${pid}/stat`, 'utf8');
		const fields = stat.slice(stat.lastIndexOf(')') + 2).split(' ');
		if (fields[0] === 'Z' || fields[0] === 'X') return null;
		const boot = readFileSync('/proc/sys/kernel/random/boot_id', 'utf8').trim();
		return { pid, started: `${boot}:${fields[19]}` };
	} catch {
		return null;
	}
}

/** @param {Identity | null | undefined} identity */
export function isAlive(identity) {
	return Boolean(identity) && identify(/** @type {Identity} */ (identity).pid)?.started === identity?.started;
}

/**
 * The words of a process's command line, empty when it is gone.
 * @param {number} pid
 */
export function commandLine(pid) {
	try {
		return readFileSync(`/proc/${pid}/cmdline`, 'utf8').split('\0').filter(Boolean);
	} catch {
		return [];
	}
}

/**
 * Processes whose working folder is this one (those of other users are seen by root only).
 * @param {string} folder
 */
export function processesIn(folder) {
	return readdirSync('/proc')
		.filter((name) => /^\d+$/.test(name))
		.map(Number)
		.filter((pid) => {
			try {
				return readlinkSync(`/proc/${pid}/cwd`) === folder;
			} catch {
				return false;
			}
		});
}

/**
 * Asks a process to end, and ends it when it does not within the time.
 * @param {Identity} identity
 * @param {{ signal?: NodeJS.Signals, seconds?: number }} [options]
 * @returns {Promise<boolean>} whether it ended by itself
 */
export async function endProcess(identity, { signal = 'SIGTERM', seconds = 15 } = {}) {
	if (!isAlive(identity)) return true;
	send(identity, signal);
	for (let waited = 0; waited < seconds * 1000; waited += 50) {
		if (!isAlive(identity)) return true;
		await sleep(50);
	}
	send(identity, 'SIGKILL');
	for (let waited = 0; waited < 5000 && isAlive(identity); waited += 20) await sleep(20);
	return false;
}

/**
 * @param {Identity} identity
 * @param {NodeJS.Signals} signal
 */
function send(identity, signal) {
	try {
		process.kill(identity.pid, signal);
	} catch (error) {
		// It ended between the look and the signal.
		if (/** @type {NodeJS.ErrnoException} */ (error).code !== 'ESRCH') throw error;
	}
}

/** @type {Set<Identity>} */
const children = new Set();

/**
 * Runs a program to its end. It gets its own process group, so that Ctrl-C reaches it only through us.
 * @param {string} command
 * @param {string[]} args
 * @param {{ cwd?: string, env?: NodeJS.ProcessEnv, log?: string, show?: boolean | 'stderr', finish?: boolean }} [options]
 *   log: a file for the whole output; show: pass the output on as it comes (its standard output to our standard error if
 *   'stderr'); finish: endChildren() lets it finish
 * @returns {Promise<{ code: number, output: string, stdout: string }>} code is 128 + n after a signal
 */
export async function run(command, args, { cwd, env = process.env, log, show, finish = false } = {}) {
	const child = spawn(command, args, { cwd, env, detached: true, stdio: ['ignore', 'pipe', 'pipe'] });
	const identity = child.pid ? identify(child.pid) : null;
	if (identity && !finish) children.add(identity);
	const file = log ? createWriteStream(log) : null;
	let output = '';
	let stdout = '';
	child.stdout.on('data', (bytes) => {
		stdout += bytes;
		output += bytes;
		file?.write(bytes);
		if (show) (show === 'stderr' ? process.stderr : process.stdout).write(bytes);
	});
	child.stderr.on('data', (bytes) => {
		output += bytes;
		file?.write(bytes);
		if (show) process.stderr.write(bytes);
	});
	try {
		const code = await new Promise((resolve, reject) => {
			child.on('error', reject);
			child.on('close', (status, signal) => resolve(status ?? (signal ? 143 : 1)));
		});
		return { code, output, stdout };
	} catch (error) {
		const reason = error instanceof Error ? error.message : String(error);
		throw new Trouble(`${command} could not be run: ${reason}`);
	} finally {
		if (identity) children.delete(identity);
		if (file) {
			file.end();
			await finished(file);
		}
	}
}

/** Ends what run() still has running, for commands that were asked to stop. */
export async function endChildren() {
	await Promise.all(
		[...children].map(async (identity) => {
			await endProcess(identity, { seconds: 20 });
		})
	);
}

/**
 * run(), where a failure is a Trouble with the program's last words.
 * @param {string} what the sentence to begin with when it fails
 * @param {string} command
 * @param {string[]} args
 * @param {Parameters<typeof run>[2]} [options]
 */
export async function must(what, command, args, options) {
	const result = await run(command, args, options);
	if (result.code !== 0) {
		const where = options?.log ? ` The whole output is in ${options.log}.` : '';
		const words = options?.show ? '' : `\n\n${lastLines(result.output, 40)}`;
		throw new Trouble(`${what} (exit code ${result.code}).${where}${words}`);
	}
	return result;
}

/**
 * Resolves with the first signal that asks this process to stop. A second one is passed to `hurry`.
 * @param {() => void} [hurry]
 * @returns {Promise<NodeJS.Signals>}
 */
export function stopRequested(hurry) {
	return new Promise((resolve) => {
		let asked = false;
		for (const signal of /** @type {NodeJS.Signals[]} */ (['SIGINT', 'SIGTERM', 'SIGHUP'])) {
			process.on(signal, () => {
				if (asked) hurry?.();
				asked = true;
				resolve(signal);
			});
		}
	});
}
