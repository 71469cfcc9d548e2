// The programs that run beside the server: the worker threads' entry and the commands. SvelteKit's build does not know
// them, so esbuild bundles them; their packages stay outside and are found in node_modules.
import { existsSync, readdirSync } from 'node:fs';
import { basename, join } from 'node:path';
import { Trouble } from './say.mjs';
import { ROOT } from './settings.mjs';

const WORKERS = ['src/lib/workers/job-thread.ts'];

/** The worker threads' entries that exist, relative to the project. */
export function workerEntries() {
	return WORKERS.filter((path) => existsSync(join(ROOT, path)));
}

/** The commands' entries: every file of src/cli itself, but no tests or declarations. */
export function commandEntries() {
	const folder = join(ROOT, 'src', 'cli');
	if (!existsSync(folder)) return [];
	return readdirSync(folder)
		.filter((name) => /^[^.]+\.ts$/.test(name))
		.map((name) => `src/cli/${name}`);
}

/**
 * @param {string[]} entries relative to the project
 * @param {string} outdir each entry NAME.ts becomes NAME.mjs there
 * @returns {Promise<string[]>} the source files that went in, relative to the project
 */
export async function bundle(entries, outdir) {
	if (entries.length === 0) return [];
	const { build, formatMessages } = await import('esbuild');
	try {
		const result = await build({
			absWorkingDir: ROOT,
			entryPoints: Object.fromEntries(entries.map((path) => [basename(path, '.ts'), path])),
			outdir,
			outExtension: { '.js': '.mjs' },
			bundle: true,
			platform: 'node',
			format: 'esm',
			target: 'node20',
			packages: 'external',
			alias: { $lib: join(ROOT, 'src', 'lib') },
			sourcemap: true,
			metafile: true,
			logLevel: 'silent'
		});
		return Object.keys(result.metafile.inputs);
	} catch (error) {
		const failure = /** @type {import('esbuild').BuildFailure} */ (error);
		if (!failure.errors) throw error;
		const messages = await formatMessages(failure.errors, { kind: 'error' });
		throw new Trouble(`Bundling ${entries.join(', ')} failed.\n\n${messages.join('\n')}`);
	}
}
