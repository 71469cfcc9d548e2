import { AppError } from '../errors';
import { listMigrations } from '../repositories/health';

/** The migrations that this build was made with, by file name. */
const NEEDED = Object.keys(import.meta.glob('/migrations/*.js')).map((path) => path.slice(path.lastIndexOf('/') + 1));

/**
 * The server can serve: its database answers and has the tables that this build wants.
 *
 * @throws AppError unavailable
 */
export async function checkHealth(): Promise<{ status: 'ok' }> {
	const unavailable = (detail: string, mend: string, cause?: unknown) =>
		new AppError('unavailable', detail, { mend, cause, retryAfter: 1 });
	let done: string[];
	try {
		done = await listMigrations();
	} catch (cause) {
		throw unavailable('The database does not answer, or has no tables yet.', 'Wait, or look whether it runs.', cause);
	}
	const missing = NEEDED.filter((name) => !done.includes(name));
	if (missing.length)
		throw unavailable(`The database lacks ${missing.join(', ')}.`, 'Stop Planish and start it again.');
	return { status: 'ok' };
}
