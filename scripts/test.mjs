// npm test: everything that can be checked, from a fresh clone. The last line is "N passed, N failed".
import { chmodSync, mkdirSync, mkdtempSync, readFileSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { build, syncTypes } from './lib/build.mjs';
import { runChecks } from './lib/checks.mjs';
import { findBinaries } from './lib/cluster.mjs';
import { ensureChromium, ensureForeignMeshes, ensurePackages, installPostgres } from './lib/install.mjs';
import { takeLock } from './lib/lock.mjs';
import { endChildren, stopRequested } from './lib/processes.mjs';
import { Trouble, main, note, say } from './lib/say.mjs';
import { ROOT } from './lib/settings.mjs';
import { runPlaywright, runVitest } from './lib/suites.mjs';
import { sweep } from './lib/sweep.mjs';

const STAGES = ['check', 'unit', 'property', 'reference', 'fuzz', 'integration', 'e2e'];
const RESULTS = join(ROOT, 'test-results');

await main(async () => {
	const stages = readOptions(process.argv.slice(2));
	let stopped = false;
	void stopRequested().then(async () => {
		stopped = true;
		note('Stopping ...');
		await endChildren();
	});
	mkdirSync(RESULTS, { recursive: true });
	const lock = takeLock(join(RESULTS, 'test.lock'));
	if (lock.heldBy) throw new Trouble(`npm test runs already in this folder (process ${lock.heldBy.pid}).`);
	// What an earlier run left because it was killed.
	const record = join(RESULTS, 'temporary-folder');
	await sweep(readText(record));
	const folder = mkdtempSync(join(tmpdir(), 'planish-test-'));
	// As root PostgreSQL runs as another user, who must be able to enter it.
	chmodSync(folder, 0o711);
	writeFileSync(record, folder);
	const total = { passed: 0, failed: 0, skipped: 0 };
	try {
		for (const [title, stage] of plan(stages, folder)) {
			if (stopped) break;
			note(`\n${title}`);
			const { passed, failed, skipped = 0 } = await stage();
			total.passed += passed;
			total.failed += failed;
			total.skipped += skipped;
		}
	} finally {
		await sweep(folder);
		lock.release();
	}
	if (stopped) throw new Trouble('Stopped before the end.', 130);
	const skipped = total.skipped > 0 ? `, ${total.skipped} skipped` : '';
	say(`\n${total.passed} passed, ${total.failed} failed${skipped}`);
	return total.failed > 0 || total.passed === 0 ? 1 : 0;
});

/**
 * @param {string[]} args
 * @returns {string[]}
 */
function readOptions(args) {
	if (args.length === 0) return STAGES;
	const chosen = args[0] === '--only' ? (args[1] ?? '').split(',') : [];
	const wrong = chosen.filter((stage) => !STAGES.includes(stage));
	if (chosen.length === 0 || args.length > 2 || wrong.length > 0) {
		throw new Trouble(`Use: npm test, or npm test -- --only with some of ${STAGES.join(',')}`);
	}
	return chosen;
}

/** @param {string} path */
function readText(path) {
	try {
		return readFileSync(path, 'utf8').trim();
	} catch {
		return '';
	}
}

/**
 * The stages in the order of their cost.
 * @param {string[]} stages
 * @param {string} folder for all that the tests make outside test-results
 * @returns {Generator<[string, () => Promise<{ passed: number, failed: number, skipped?: number }>]>}
 */
function* plan(stages, folder) {
	/** @type {NodeJS.ProcessEnv} */
	const env = { ...process.env, PLANISH_TEST_FOLDER: folder, NO_COLOR: '1', FORCE_COLOR: '0' };
	delete env.DATABASE_URL;
	let built = true;
	yield [
		'Preparing',
		async () => {
			if (stages.some((stage) => ['reference', 'integration', 'e2e'].includes(stage))) {
				env.PLANISH_FOREIGN_MESHES = await ensureForeignMeshes();
			}
			if (stages.includes('integration') || stages.includes('e2e')) {
				if (!findBinaries()) await installPostgres();
			}
			if (stages.includes('e2e')) env.PLANISH_CHROMIUM = await ensureChromium();
			await ensurePackages();
			await syncTypes();
			return { passed: 0, failed: 0 };
		}
	];
	if (stages.includes('check')) yield ['Format, lint, types, layers', runChecks];
	const pure = ['unit', 'property', 'reference', 'fuzz'].filter((stage) => stages.includes(stage));
	if (pure.length > 0) yield [`Tests: ${pure.join(', ')}`, () => runVitest('vitest', pure, env)];
	if (stages.includes('integration') || stages.includes('e2e')) {
		yield [
			'Build',
			async () => {
				try {
					await build();
					note('  ok      build');
					return { passed: 1, failed: 0 };
				} catch (error) {
					built = false;
					note(`  FAILED  build\n${error instanceof Error ? error.message : String(error)}`);
					return { passed: 0, failed: 1 };
				}
			}
		];
	}
	if (built && stages.includes('integration')) {
		yield ['Tests: integration', () => runVitest('integration', ['integration'], env)];
	}
	if (built && stages.includes('e2e')) {
		const data = join(folder, 'e2e');
		yield ['Tests: end to end', () => runPlaywright({ ...env, PLANISH_E2E_DATA: data })];
	}
	if (!built) note('\nIntegration and end-to-end tests did not run: there is no build.');
}
