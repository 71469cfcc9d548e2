import { spawn } from 'node:child_process';
import { existsSync } from 'node:fs';
import { join } from 'node:path';
import { appEnvironment, runCommand } from './app.mjs';
import { ensureBuilt } from './build.mjs';
import { openDatabase } from './database.mjs';
import { ensurePackages } from './install.mjs';
import { Trouble } from './say.mjs';
import { ROOT, readSettings } from './settings.mjs';

/**
 * Runs one of the application's commands with this terminal, on the database that runs; the private one is started for the
 * time of the command if it does not.
 * @param {string} name build/cli/NAME.mjs
 * @param {string[]} args
 * @returns {Promise<number>} the command's own exit code
 */
export async function runInTerminal(name, args) {
	const settings = readSettings();
	await ensurePackages();
	await ensureBuilt({ anyWillDo: true });
	const path = join(ROOT, 'build', 'cli', `${name}.mjs`);
	if (!existsSync(path)) throw new Trouble(`${path} is missing: run npm run build.`);
	const database = await openDatabase(settings.data);
	try {
		const env = appEnvironment(settings, database.url);
		await runCommand('migrate', env, { what: 'The database could not be brought up to date' });
		const child = spawn(process.execPath, ['--enable-source-maps', path, ...args], {
			cwd: ROOT,
			env,
			stdio: 'inherit'
		});
		// Ctrl-C reaches the child by itself; here it must not cut off the release of the database.
		for (const signal of ['SIGINT', 'SIGTERM', 'SIGHUP']) process.on(signal, () => child.kill());
		return await new Promise((resolve, reject) => {
			child.on('error', reject);
			child.on('close', (code) => resolve(code ?? 130));
		});
	} finally {
		await database.release();
	}
}
