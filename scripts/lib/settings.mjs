import { mkdirSync } from 'node:fs';
import { dirname, join, resolve } from 'node:path';
import { fileURLToPath } from 'node:url';
import { Trouble } from './say.mjs';

/** The project's folder. */
export const ROOT = dirname(dirname(dirname(fileURLToPath(import.meta.url))));

/** @typedef {{ host: string, port: number, url: string, origin: string, originGiven: boolean, data: string }} Settings */

/**
 * HOST, PORT, ORIGIN and PLANISH_DATA, checked and with their defaults.
 * @param {NodeJS.ProcessEnv} [env]
 * @returns {Settings}
 */
export function readSettings(env = process.env) {
	const host = env.HOST || '127.0.0.1';
	const port = env.PORT ? Number(env.PORT) : 3000;
	if (!Number.isInteger(port) || port < 1 || port > 65535) {
		throw new Trouble(`PORT is "${env.PORT}". It must be a whole number from 1 to 65535.`);
	}
	// A server that listens on every address is still reached from this machine by loopback.
	const reachable = { '0.0.0.0': '127.0.0.1', '::': '[::1]' }[host] ?? (host.includes(':') ? `[${host}]` : host);
	const url = `http://${reachable}:${port}`;
	const origin = env.ORIGIN || url;
	if (!URL.canParse(origin) || !['http:', 'https:'].includes(new URL(origin).protocol)) {
		throw new Trouble(`ORIGIN is "${origin}". It must be the address people type, such as https://planish.example.org`);
	}
	const data = resolve(ROOT, env.PLANISH_DATA || 'data');
	return { host, port, url, origin: new URL(origin).origin, originGiven: Boolean(env.ORIGIN), data };
}

/**
 * A folder inside the data folder, made when missing. The data folder itself may be entered by other users (PostgreSQL
 * runs as another user when the command runs as root); every file in it that holds a secret is readable by its owner only.
 * @param {string} data
 * @param {string} [name]
 */
export function dataFolder(data, name) {
	try {
		mkdirSync(data, { recursive: true, mode: 0o711 });
		if (!name) return data;
		const folder = join(data, name);
		mkdirSync(folder, { recursive: true, mode: 0o700 });
		return folder;
	} catch (error) {
		const reason = error instanceof Error ? error.message : String(error);
		throw new Trouble(`The data folder ${data} cannot be written (${reason}). Set PLANISH_DATA to a folder of yours.`);
	}
}
