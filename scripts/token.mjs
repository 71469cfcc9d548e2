// npm run token -- --email E [--study ID]: prints a new API token as its last line.
import { appEnvironment, runCommand } from './lib/app.mjs';
import { ensureBuilt } from './lib/build.mjs';
import { openDatabase } from './lib/database.mjs';
import { ensurePackages } from './lib/install.mjs';
import { main } from './lib/say.mjs';
import { readSettings } from './lib/settings.mjs';

await main(async () => {
	const settings = readSettings();
	await ensurePackages();
	await ensureBuilt({ anyWillDo: true });
	// Starts the private database for the time of the command if nothing runs.
	const database = await openDatabase(settings.data);
	try {
		const env = appEnvironment(settings, database.url);
		await runCommand('migrate', env, { what: 'The database could not be brought up to date' });
		const args = process.argv.slice(2);
		const printed = await runCommand('token', env, { args, what: 'No token was made' });
		process.stdout.write(printed.stdout);
	} finally {
		await database.release();
	}
});
