import { relative } from 'node:path';
import { bundle, workerEntries } from './bundles.mjs';
import { ROOT } from './settings.mjs';

/**
 * A vite plugin that bundles the worker threads' entry again when one of its sources changes. It listens to vite's own
 * watcher: a watching esbuild would keep a process of its own alive.
 * @param {string} outdir
 * @returns {import('vite').Plugin}
 */
export function planishWorkers(outdir) {
	return {
		name: 'planish-workers',
		apply: 'serve',
		async configureServer(server) {
			let sources = new Set(await bundle(workerEntries(), outdir));
			/** @type {NodeJS.Timeout | undefined} */
			let timer;
			const rebuild = async () => {
				try {
					sources = new Set(await bundle(workerEntries(), outdir));
					server.config.logger.info('worker threads: bundled again', { timestamp: true });
				} catch (error) {
					server.config.logger.error(error instanceof Error ? error.message : String(error), { timestamp: true });
				}
			};
			server.watcher.on('all', (_event, path) => {
				const source = relative(ROOT, path);
				if (!sources.has(source) && !workerEntries().includes(source)) return;
				// An editor writes several times; once is enough.
				clearTimeout(timer);
				timer = setTimeout(() => void rebuild(), 100);
			});
			server.httpServer?.on('close', () => clearTimeout(timer));
		}
	};
}
