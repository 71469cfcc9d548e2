// npm start: everything from a fresh clone to a running product. Safe to run twice, and after anything was killed.
import { setTimeout as sleep } from 'node:timers/promises';
import { appEnvironment, demoAccounts, prepareDatabase, startServer } from './lib/app.mjs';
import { ensureBuilt } from './lib/build.mjs';
import { ensurePostgres } from './lib/cluster.mjs';
import { openDatabase } from './lib/database.mjs';
import { ensurePackages } from './lib/install.mjs';
import { claim } from './lib/prepare.mjs';
import { endChildren, stopRequested } from './lib/processes.mjs';
import { Trouble, main, note, say } from './lib/say.mjs';
import { readSettings } from './lib/settings.mjs';

await main(async () => {
	const settings = readSettings();
	const claimed = await claim(settings);
	if (!claimed) return 0;
	const stopping = stopRequested(() => note('Still stopping; it takes some seconds.'));
	// A signal during the preparation ends the program that runs, so that serve() fails and cleans up behind itself.
	void stopping.then(endChildren);
	try {
		return await serve(settings, stopping);
	} finally {
		claimed.release();
	}
});

/**
 * @param {import('./lib/settings.mjs').Settings} settings
 * @param {Promise<NodeJS.Signals>} stopping
 */
async function serve(settings, stopping) {
	let asked = false;
	void stopping.then(() => (asked = true));
	/** @type {import('./lib/database.mjs').Database | undefined} */
	let database;
	/** @type {import('./lib/app.mjs').Server | undefined} */
	let server;
	try {
		if (!process.env.DATABASE_URL) await ensurePostgres(settings.data);
		await ensurePackages();
		await ensureBuilt();
		database = await openDatabase(settings.data);
		const env = appEnvironment(settings, database.url);
		await prepareDatabase(settings, env);
		server = await startServer(settings.url, settings.data, env, stopping);
		if (!asked) announce(settings, database, server);
		const reason = await Promise.race([
			stopping.then(() => null),
			server.ended.then(
				(how) => `The server ${how} unexpectedly. The end of its log, ${server?.log}:\n\n${server?.lastWords()}`
			),
			databaseDeath(database)
		]);
		if (reason) throw new Trouble(reason);
		return 0;
	} catch (error) {
		if (asked && !server) return 130;
		throw error;
	} finally {
		if (server) {
			note('Stopping the server ...');
			await server.stop();
		}
		if (database?.isPrivate) {
			const how = await database.release();
			if (how === 'in use') note('PostgreSQL stays up: another command still uses it, and stops it when it ends.');
			if (how === 'by force') note('PostgreSQL did not stop in time and was ended; it recovers at the next start.');
		}
	}
}

/**
 * @param {import('./lib/database.mjs').Database} database
 * @returns {Promise<string>} resolves when the private server's process is gone
 */
async function databaseDeath(database) {
	while (database.isAlive()) await sleep(1000, undefined, { ref: false });
	return `PostgreSQL has ended unexpectedly. Its log is ${database.log}. Nothing committed is lost: run npm start again.`;
}

/**
 * @param {import('./lib/settings.mjs').Settings} settings
 * @param {import('./lib/database.mjs').Database} database
 * @param {import('./lib/app.mjs').Server} server
 */
function announce({ url, origin, originGiven, host, data }, database, server) {
	say('');
	say(`Planish: ${originGiven ? origin : url}`);
	const accounts = demoAccounts(data);
	if (accounts.length > 0) {
		say('Sign-ins of the demo (invented people):');
		const width = Math.max(...accounts.map((account) => account.email.length));
		for (const { role, email, password } of accounts) say(`    ${role.padEnd(9)} ${email.padEnd(width)}  ${password}`);
	}
	say(`Data:    ${data}`);
	say(`         ${database.where}`);
	say(`         server log ${server.log}`);
	const loopback = host === 'localhost' || host === '::1' || host.startsWith('127.');
	if (!loopback && accounts.length > 0) {
		say(
			"Others can reach this address, and the demo's passwords are no secret: change them, or start with PLANISH_DEMO=none."
		);
	}
	if (!originGiven && (host === '0.0.0.0' || host === '::')) {
		say(`People who come by another address than ${url} can sign in only when ORIGIN is set to the address they type.`);
	}
	say('Ctrl-C stops it.');
}
