// npm run dev: vite's development server on the private database, with the worker threads' bundle kept fresh.
import { join } from 'node:path';
import { setTimeout as sleep } from 'node:timers/promises';
import { appEnvironment, demoAccounts, prepareDatabase } from './lib/app.mjs';
import { syncTypes } from './lib/build.mjs';
import { bundle, commandEntries, workerEntries } from './lib/bundles.mjs';
import { ensurePostgres } from './lib/cluster.mjs';
import { openDatabase } from './lib/database.mjs';
import { ensurePackages } from './lib/install.mjs';
import { claim } from './lib/prepare.mjs';
import { stopRequested } from './lib/processes.mjs';
import { Trouble, main, say } from './lib/say.mjs';
import { ROOT, readSettings } from './lib/settings.mjs';
import { planishWorkers } from './lib/vite-workers.mjs';

// Not build/: a product may be running from there.
const FOLDER = join(ROOT, '.svelte-kit', 'bundles');

await main(async () => {
	const settings = readSettings();
	const claimed = await claim(settings);
	if (!claimed) return 0;
	const stopping = stopRequested();
	let database;
	let server;
	try {
		if (!process.env.DATABASE_URL) await ensurePostgres(settings.data);
		await ensurePackages();
		await syncTypes();
		await bundle(workerEntries(), join(FOLDER, 'workers'));
		await bundle(commandEntries(), join(FOLDER, 'cli'));
		database = await openDatabase(settings.data);
		Object.assign(process.env, appEnvironment(settings, database.url), {
			NODE_ENV: 'development',
			PLANISH_WORKER_DIR: join(FOLDER, 'workers')
		});
		await prepareDatabase(settings, process.env, join(FOLDER, 'cli'));
		const { createServer } = await import('vite');
		const ours = process.listeners('SIGTERM');
		server = await createServer({
			root: ROOT,
			plugins: [planishWorkers(join(FOLDER, 'workers'))],
			server: { host: settings.host, port: settings.port, strictPort: true }
		});
		// Vite's own handler would end the process before PostgreSQL is stopped.
		for (const listener of process.listeners('SIGTERM')) {
			if (!ours.includes(listener)) process.off('SIGTERM', listener);
		}
		await server.listen();
		server.printUrls();
		for (const { role, email, password } of demoAccounts(settings.data)) say(`    ${role}  ${email}  ${password}`);
		const { isAlive, log } = database;
		const death = async () => {
			while (isAlive()) await sleep(1000, undefined, { ref: false });
			return `PostgreSQL has ended unexpectedly. Its log is ${log}.`;
		};
		const reason = await Promise.race([stopping.then(() => null), death()]);
		if (reason) throw new Trouble(reason);
	} finally {
		await server?.close();
		await database?.release();
		claimed.release();
	}
	// The application's own pools and timers would keep this process alive.
	process.exit(0);
});
