// The test suites: each runs its runner with a long output in a file and gives counts and what failed.
import { existsSync, readFileSync, rmSync } from 'node:fs';
import { join, relative } from 'node:path';
import { tool } from './build.mjs';
import { run } from './processes.mjs';
import { lastLines, note } from './say.mjs';
import { ROOT } from './settings.mjs';

/** @typedef {{ passed: number, failed: number, skipped: number }} Counts */

const RESULTS = join(ROOT, 'test-results');

/**
 * @param {string} path
 * @returns {any} null when the runner died before it wrote its report
 */
function report(path) {
	return existsSync(path) ? JSON.parse(readFileSync(path, 'utf8')) : null;
}

/**
 * @param {string} name
 * @param {string[]} args
 * @param {string} json where the runner writes its report
 * @param {NodeJS.ProcessEnv} env
 * @param {(report: any) => Counts & { failures: string[] }} read
 * @returns {Promise<Counts>}
 */
async function runSuite(name, args, json, env, read) {
	const log = join(RESULTS, `${name}.log`);
	rmSync(json, { force: true });
	const begin = Date.now();
	const { code, output } = await run(process.execPath, args, { cwd: ROOT, env, log });
	const written = report(json);
	const { failures, ...counts } = written ? read(written) : { passed: 0, failed: 0, skipped: 0, failures: [] };
	// A runner that fails without a failed test (an uncaught error, no test found) has failed all the same.
	const unexplained = code !== 0 && counts.failed === 0;
	if (unexplained) counts.failed = 1;
	const time = `${((Date.now() - begin) / 1000).toFixed(1)} s`;
	const skipped = counts.skipped > 0 ? `, ${counts.skipped} skipped` : '';
	const word = counts.failed > 0 ? 'FAILED ' : 'ok     ';
	note(`  ${word} ${name}: ${counts.passed} passed, ${counts.failed} failed${skipped} (${time})`);
	for (const failure of failures.slice(0, 20)) note(`\n    ${failure.split('\n').slice(0, 12).join('\n    ')}`);
	if (failures.length > 20) note(`\n    and ${failures.length - 20} more`);
	if (unexplained) note(lastLines(output, 40));
	if (counts.failed > 0) note(`\n    The whole output is in ${relative(ROOT, log)}`);
	return counts;
}

/**
 * @param {string} name for the files under test-results
 * @param {string[]} projects of vitest.config.ts
 * @param {NodeJS.ProcessEnv} env
 */
export function runVitest(name, projects, env) {
	const json = join(RESULTS, `${name}.json`);
	const args = [tool('vitest/vitest.mjs'), 'run', ...projects.flatMap((project) => ['--project', project])];
	args.push('--reporter=default', '--reporter=json', `--outputFile.json=${json}`);
	return runSuite(name, args, json, env, (written) => {
		const failures = [];
		let brokenFiles = 0;
		for (const file of written.testResults) {
			const where = relative(ROOT, file.name);
			const failed = file.assertionResults.filter((/** @type {any} */ test) => test.status === 'failed');
			for (const test of failed) failures.push(`${where} > ${test.fullName}\n${test.failureMessages.join('\n')}`);
			// A file that could not be loaded, or whose hooks failed, has no failed test of its own.
			if (file.status === 'failed' && failed.length === 0) {
				brokenFiles++;
				failures.push(`${where}\n${file.message}`);
			}
		}
		return {
			passed: written.numPassedTests,
			failed: written.numFailedTests + brokenFiles,
			skipped: written.numPendingTests + written.numTodoTests,
			failures
		};
	});
}

/** @param {NodeJS.ProcessEnv} env */
export function runPlaywright(env) {
	const json = join(RESULTS, 'e2e.json');
	return runSuite('e2e', [tool('@playwright/test/cli.js'), 'test'], json, env, (written) => {
		/** @type {string[]} */
		const failures = (written.errors ?? []).map((/** @type {any} */ error) => error.message ?? String(error));
		const visit = (/** @type {any} */ suite) => {
			for (const inner of suite.suites ?? []) visit(inner);
			for (const spec of suite.specs ?? []) {
				if (spec.ok) continue;
				const errors = spec.tests.flatMap((/** @type {any} */ test) => test.results.flatMap((r) => r.errors ?? []));
				failures.push(
					`tests/e2e/${spec.file}:${spec.line} > ${spec.title}\n${errors.map((e) => e.message).join('\n')}`
				);
			}
		};
		written.suites.forEach(visit);
		const { expected, unexpected, flaky, skipped } = written.stats;
		return { passed: expected, failed: unexpected + flaky, skipped, failures };
	});
}
