// A lock is a file that names the process holding it; one left by a dead process is taken over.
import { linkSync, readFileSync, renameSync, rmSync, writeFileSync } from 'node:fs';
import { setTimeout as sleep } from 'node:timers/promises';
import { identify, isAlive } from './processes.mjs';
import { Trouble } from './say.mjs';

/** @typedef {import('./processes.mjs').Identity & Record<string, unknown>} Holder */

/**
 * @param {string} path
 * @returns {Holder | null}
 */
export function readHolder(path) {
	try {
		return JSON.parse(readFileSync(path, 'utf8'));
	} catch {
		return null;
	}
}

/**
 * @param {string} path
 * @param {Record<string, unknown>} [details] kept in the file beside the process
 * @returns {{ heldBy: Holder, release?: undefined } | { release: () => void, heldBy?: undefined }}
 */
export function takeLock(path, details = {}) {
	const self = { ...identify(process.pid), ...details };
	const own = `${path}.${process.pid}`;
	// Written whole before it gets its name: whoever reads the lock never sees half of it.
	writeFileSync(own, JSON.stringify(self), { mode: 0o600 });
	try {
		for (;;) {
			try {
				linkSync(own, path);
				return { release: () => rmSync(path, { force: true }) };
			} catch (error) {
				if (/** @type {NodeJS.ErrnoException} */ (error).code !== 'EEXIST') throw error;
			}
			const holder = readHolder(path);
			if (holder && isAlive(holder)) return { heldBy: holder };
			const stale = `${path}.stale.${process.pid}`;
			try {
				renameSync(path, stale);
			} catch {
				continue;
			}
			// Another process may have taken the lock over between the look and the renaming: then it gets it back.
			const moved = readHolder(stale);
			if (moved && isAlive(moved)) renameSync(stale, path);
			else rmSync(stale, { force: true });
		}
	} finally {
		rmSync(own, { force: true });
	}
}

/**
 * Runs `body` while holding the lock, waiting for it first.
 * @template T
 * @param {string} path
 * @param {() => Promise<T>} body
 * @param {{ seconds?: number }} [options]
 * @returns {Promise<T>}
 */
export async function withLock(path, body, { seconds = 600 } = {}) {
	const until = Date.now() + seconds * 1000;
	for (;;) {
		const lock = takeLock(path);
		if (lock.release) {
			try {
				return await body();
			} finally {
				lock.release();
			}
		}
		if (Date.now() > until) {
			throw new Trouble(`Process ${lock.heldBy.pid} has held ${path} for ${seconds} s. End it and start again.`);
		}
		await sleep(100);
	}
}
