// node scripts/database.mjs PROGRAM ARGS...: runs one of PostgreSQL's own programs (psql, pg_dump, pg_restore, ...) on the
// installation's database, which is started for that time if it does not run.
import { spawn } from 'node:child_process';
import { existsSync } from 'node:fs';
import { join } from 'node:path';
import { ensurePostgres, findBinaries } from './lib/cluster.mjs';
import { openDatabase } from './lib/database.mjs';
import { Trouble, main } from './lib/say.mjs';
import { readSettings } from './lib/settings.mjs';

await main(async () => {
	const [program = 'psql', ...args] = process.argv.slice(2);
	const { data } = readSettings();
	await ensurePostgres(data);
	const path = join(findBinaries() ?? '', program);
	if (!/^[a-z_]+$/.test(program) || !existsSync(path)) throw new Trouble(`PostgreSQL has no program "${program}".`);
	const database = await openDatabase(data);
	try {
		const { hostname, port, username, password, pathname } = new URL(database.url);
		const env = {
			...process.env,
			PGHOST: decodeURIComponent(hostname),
			PGPORT: port || '5432',
			PGUSER: decodeURIComponent(username),
			PGPASSWORD: decodeURIComponent(password),
			PGDATABASE: decodeURIComponent(pathname.slice(1))
		};
		const child = spawn(path, args, { env, stdio: 'inherit' });
		// Ctrl-C is the program's; here it must not cut off the release of the database.
		for (const signal of ['SIGINT', 'SIGTERM', 'SIGHUP']) process.on(signal, () => {});
		return await new Promise((resolve, reject) => {
			child.on('error', reject);
			child.on('close', (code) => resolve(code ?? 130));
		});
	} finally {
		await database.release();
	}
});
