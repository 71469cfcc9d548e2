/** Works on jobs of DATABASE_URL without serving pages: as many of these as one likes, on any machine. Ctrl-C ends it in order. */
import { closeDatabase, database } from '$lib/server/db/client';
import { startJobs, stopJobs } from '$lib/server/jobs/runtime';
import { explain } from './shared/explain';

const asked = new Promise<void>((resolve) => {
	process.once('SIGINT', () => resolve());
	process.once('SIGTERM', () => resolve());
});

try {
	// Says at once when there is no database.
	await database().authenticate();
	await startJobs();
	await asked;
} catch (thrown) {
	process.exitCode = explain(thrown, 'npm run worker');
} finally {
	await stopJobs();
	await closeDatabase();
}
