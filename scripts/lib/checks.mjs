// The static checks: format, lint, types, layers. Each is one check that passes or fails.
import { existsSync, mkdirSync } from 'node:fs';
import { join, relative } from 'node:path';
import { syncTypes, tool } from './build.mjs';
import { run } from './processes.mjs';
import { lastLines, note } from './say.mjs';
import { ROOT } from './settings.mjs';

/** @type {[string, string[]][]} */
const CHECKS = [
	['format', [tool('prettier/bin/prettier.cjs'), '--check', '.']],
	['types', [tool('svelte-check/bin/svelte-check'), '--tsconfig', './tsconfig.json', '--fail-on-warnings']],
	['lint', [tool('eslint/bin/eslint.js'), '.', '--max-warnings', '0']],
	[
		'layers',
		[
			tool('dependency-cruiser/bin/dependency-cruise.mjs'),
			...['src', 'tests', 'bench', 'scripts', 'migrations'].filter((folder) => existsSync(join(ROOT, folder))),
			...['--config', '.dependency-cruiser.js', '--output-type', 'err-long']
		]
	]
];

/**
 * Runs all checks, two at a time.
 * @returns {Promise<{ passed: number, failed: number }>}
 */
export async function runChecks() {
	await syncTypes();
	mkdirSync(join(ROOT, 'test-results'), { recursive: true });
	const counts = { passed: 0, failed: 0 };
	const queue = [...CHECKS];
	const next = async () => {
		for (let check = queue.shift(); check; check = queue.shift()) {
			const [name, args] = check;
			const log = join(ROOT, 'test-results', `check-${name}.log`);
			const begin = Date.now();
			const env = { ...process.env, NO_COLOR: '1', FORCE_COLOR: '0' };
			const { code, output } = await run(process.execPath, args, { cwd: ROOT, env, log });
			const time = `${((Date.now() - begin) / 1000).toFixed(1)} s`;
			if (code === 0) {
				counts.passed++;
				note(`  ok      ${name} (${time})`);
			} else {
				counts.failed++;
				note(`  FAILED  ${name} (${time}), the whole output is in ${relative(ROOT, log)}\n${lastLines(output, 40)}`);
			}
		}
	};
	await Promise.all([next(), next()]);
	return counts;
}
