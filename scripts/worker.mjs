// npm run worker: takes jobs from the queue in this process's worker threads, beside the server or on another machine.
import { spawn } from 'node:child_process';
import { join } from 'node:path';
import { appEnvironment } from './lib/app.mjs';
import { ensureBuilt } from './lib/build.mjs';
import { openDatabase } from './lib/database.mjs';
import { ensurePackages } from './lib/install.mjs';
import { endProcess, identify, stopRequested } from './lib/processes.mjs';
import { Trouble, main, note } from './lib/say.mjs';
import { ROOT, readSettings } from './lib/settings.mjs';

await main(async () => {
	const settings = readSettings();
	const stopping = stopRequested(() => note('Still stopping; a job is being handed back.'));
	await ensurePackages();
	await ensureBuilt({ anyWillDo: true });
	const database = await openDatabase(settings.data);
	try {
		const watch = join(ROOT, 'scripts', 'lib', 'end-with-parent.mjs');
		const child = spawn(
			process.execPath,
			['--enable-source-maps', '--import', watch, join(ROOT, 'build', 'cli', 'worker.mjs')],
			{
				cwd: ROOT,
				env: appEnvironment(settings, database.url),
				detached: true,
				stdio: ['ignore', 'inherit', 'inherit', 'ipc']
			}
		);
		const identity = child.pid ? identify(child.pid) : null;
		note(`Worker process ${child.pid}, queue in ${database.where}. Ctrl-C stops it.`);
		const ended = new Promise((resolve) => {
			child.on('error', (error) => resolve(`could not be run: ${error.message}`));
			child.on('close', (code, signal) => resolve(signal ? `was ended by ${signal}` : `ended with exit code ${code}`));
		});
		const how = await Promise.race([ended, stopping.then(() => null)]);
		if (how) throw new Trouble(`The worker ${how}.`);
		// Its jobs go back to the queue if they take longer than this.
		if (identity) await endProcess(identity, { seconds: 20 });
	} finally {
		await database.release();
	}
});
