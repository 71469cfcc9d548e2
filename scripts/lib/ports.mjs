import { createServer } from 'node:net';
import { randomInt } from 'node:crypto';
import { Trouble } from './say.mjs';

/**
 * Whether a server could listen there now.
 * @param {string} host
 * @param {number} port
 * @returns {Promise<string | null>} null, or the error's code (EADDRINUSE, EACCES, EADDRNOTAVAIL, ...)
 */
export function whyNot(host, port) {
	return new Promise((resolve) => {
		const probe = createServer();
		probe.once('error', (error) => resolve(/** @type {NodeJS.ErrnoException} */ (error).code ?? 'EUNKNOWN'));
		probe.listen({ host, port, exclusive: true }, () => probe.close(() => resolve(null)));
	});
}

/** A free loopback port below the range from which the system takes ports for outgoing connections. */
export async function freePort() {
	for (let attempt = 0; attempt < 100; attempt++) {
		const port = randomInt(20000, 32000);
		if ((await whyNot('127.0.0.1', port)) === null) return port;
	}
	throw new Trouble('No free port was found between 20000 and 32000 on 127.0.0.1.');
}

/**
 * A Trouble with the sentence for a HOST and PORT that cannot be listened on; nothing when they can.
 * @param {import('./settings.mjs').Settings} settings
 */
export async function requireFreePort({ host, port }) {
	const code = await whyNot(host, port);
	if (code === null) return;
	const other = port < 65535 ? port + 1 : 3000;
	if (code === 'EADDRINUSE') {
		throw new Trouble(
			`Port ${port} on ${host} is taken by another program. Choose another, for example: PORT=${other} npm start`
		);
	}
	if (code === 'EACCES') {
		throw new Trouble(`This user may not open port ${port}. Choose one from 1024 on, for example: PORT=3000 npm start`);
	}
	if (code === 'EADDRNOTAVAIL' || code === 'ENOTFOUND') {
		throw new Trouble(`HOST is "${host}", which is not an address of this machine. 127.0.0.1 always is.`);
	}
	throw new Trouble(`The server cannot listen on ${host}:${port} (${code}).`);
}
