import { createHash } from 'node:crypto';
import { existsSync, mkdirSync, readFileSync, readdirSync, rmSync, statSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { bundle, commandEntries, workerEntries } from './bundles.mjs';
import { withLock } from './lock.mjs';
import { must } from './processes.mjs';
import { note } from './say.mjs';
import { ROOT } from './settings.mjs';

const BUILD = join(ROOT, 'build');
const STAMP = join(BUILD, '.sources');
const SOURCES = ['src', 'static', 'scripts/lib/build.mjs', 'scripts/lib/bundles.mjs'];
const CONFIGS = [
	'package.json',
	'package-lock.json',
	'svelte.config.js',
	'vite.config.ts',
	'tailwind.config.js',
	'tsconfig.json'
];

/** One hash over the names and bytes of all that the build reads. */
function hashSources() {
	const hash = createHash('sha256').update(process.versions.node.split('.')[0]);
	/** @param {string} path */
	const add = (path) => {
		hash.update(`\0${path}\0`);
		hash.update(readFileSync(join(ROOT, path)));
	};
	/** @param {string} path */
	const walk = (path) => {
		if (!existsSync(join(ROOT, path))) return;
		// By what it is, not by its name: a route's folder may be called openapi.json.
		if (statSync(join(ROOT, path)).isFile()) return add(path);
		for (const entry of readdirSync(join(ROOT, path), { withFileTypes: true }).sort((a, b) =>
			a.name < b.name ? -1 : 1
		)) {
			const inner = `${path}/${entry.name}`;
			if (entry.isDirectory()) walk(inner);
			else if (entry.isFile()) add(inner);
		}
	};
	for (const path of [...SOURCES, ...CONFIGS]) walk(path);
	return hash.digest('hex');
}

/** @param {string} name a program of a package, by its path in node_modules */
export function tool(name) {
	return join(ROOT, 'node_modules', name);
}

/** Writes .svelte-kit/tsconfig.json and the types that depend on the routes. */
export async function syncTypes() {
	await must('svelte-kit sync failed', process.execPath, [tool('@sveltejs/kit/svelte-kit.js'), 'sync'], { cwd: ROOT });
}

/** Builds everything, whatever is there. */
export async function build() {
	const hash = hashSources();
	rmSync(STAMP, { force: true });
	mkdirSync(join(ROOT, 'test-results'), { recursive: true });
	const log = join(ROOT, 'test-results', 'build.log');
	await must('The build failed', process.execPath, [tool('vite/bin/vite.js'), 'build'], {
		cwd: ROOT,
		env: { ...process.env, NODE_ENV: 'production' },
		log
	});
	await bundle(workerEntries(), join(BUILD, 'workers'));
	await bundle(commandEntries(), join(BUILD, 'cli'));
	writeFileSync(STAMP, hash);
}

/**
 * Builds if the sources changed since the last build.
 * @param {{ anyWillDo?: boolean }} [options] anyWillDo: keep a finished build of older sources, which a server may be serving
 */
export async function ensureBuilt({ anyWillDo = false } = {}) {
	const current = () => existsSync(STAMP) && (anyWillDo || readFileSync(STAMP, 'utf8') === hashSources());
	if (current()) return;
	mkdirSync(join(ROOT, '.svelte-kit'), { recursive: true });
	await withLock(join(ROOT, '.svelte-kit', 'build.lock'), async () => {
		if (current()) return;
		note('Building (a minute at the first start) ...');
		await build();
	});
}
