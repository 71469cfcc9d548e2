/** What the server does once when it starts, and when it ends. */
import { closeDatabase } from './db/client';
import { endStreams, startJobs, stopJobs, warmPreviews } from './jobs/runtime';
import { log } from './log';

/**
 * Begins to work on jobs, and arranges for an orderly end: adapter-node sends `sveltekit:shutdown` once it has answered
 * what was asked.
 *
 * @throws Error when a setting is missing or the database does not answer
 */
export async function startServing(): Promise<void> {
	if (!process.env.AUTH_SECRET) {
		throw new Error('AUTH_SECRET is not set; npm start makes one and keeps it in the data folder.');
	}
	await startJobs();
	void warmPreviews();
	// adapter-node waits for open answers; those of watchers would not end by themselves.
	for (const signal of ['SIGTERM', 'SIGINT']) process.once(signal, endStreams);
	process.once('sveltekit:shutdown', () => {
		stopJobs()
			.then(closeDatabase)
			.catch((error) => log.error({ err: error }, 'the server did not end in order'));
	});
}
