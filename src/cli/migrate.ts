/** Brings the database of DATABASE_URL up to date, with the queue's own tables. Safe to run at any time and from several places at once. */
import { existsSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { closeDatabase, database } from '$lib/server/db/client';
import { migrate } from '$lib/server/db/migrate';
import { Queue } from '$lib/server/jobs/queue';

/** The project's migrations, from wherever in it this file was bundled to. */
function migrationsFolder(): string {
	for (let folder = dirname(fileURLToPath(import.meta.url)); ; folder = dirname(folder)) {
		const candidate = join(folder, 'migrations');
		if (existsSync(join(candidate, '0001_people.js'))) return candidate;
		if (folder === dirname(folder)) throw new Error('The folder `migrations` is not above this command.');
	}
}

try {
	const applied = await migrate(database(), migrationsFolder());
	for (const name of applied) console.log(`applied ${name}`);
	const queue = new Queue();
	await queue.open();
	await queue.close();
} finally {
	await closeDatabase();
}
