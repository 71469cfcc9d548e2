import { join } from 'node:path';
import { endOrphan, untilHealthy } from './app.mjs';
import { readHolder, takeLock } from './lock.mjs';
import { requireFreePort } from './ports.mjs';
import { note, say } from './say.mjs';
import { dataFolder } from './settings.mjs';

/**
 * Makes this process the one that serves the data folder.
 * @param {import('./settings.mjs').Settings} settings
 * @returns {Promise<null | { release: () => void }>} null when another one serves it already, which is then said
 */
export async function claim(settings) {
	const path = join(dataFolder(settings.data, 'run'), 'serving.lock');
	const lock = takeLock(path, { url: settings.url });
	if (lock.release) {
		try {
			await endOrphan(settings.data);
			await requireFreePort(settings);
		} catch (error) {
			lock.release();
			throw error;
		}
		return { release: lock.release };
	}
	const url = String(lock.heldBy.url);
	note(`Planish is running already with this data folder (process ${lock.heldBy.pid}).`);
	while (!(await untilHealthy(url, 3))) {
		// It stopped, or was stopped, meanwhile: then this one takes its place.
		if (readHolder(path)?.pid !== lock.heldBy.pid) return claim(settings);
		note('It is not serving yet; waiting ...');
	}
	say(`Planish: ${url}`);
	return null;
}
