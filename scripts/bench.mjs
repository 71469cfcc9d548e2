// The benchmark: npm run bench -- [--json] [--level 8] [--repeat 3] [--compare]
import { execFileSync, spawnSync } from 'node:child_process';
import { existsSync, mkdirSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { fileURLToPath, pathToFileURL } from 'node:url';

const root = dirname(dirname(fileURLToPath(import.meta.url)));
const PYTHON = '/usr/bin/python3';

const args = process.argv.slice(2);
const known = new Set(['--json', '--compare', '--level', '--repeat', '--help']);
const numberAfter = (name, fallback, low, high) => {
	const at = args.indexOf(name);
	if (at < 0) return fallback;
	const value = Number(args[at + 1]);
	if (!Number.isInteger(value) || value < low || value > high)
		fail(`${name} needs a whole number from ${low} to ${high}.`);
	return value;
};
function fail(message) {
	console.error(message);
	process.exit(2);
}
args.forEach((a, i) => {
	const isValue = i > 0 && (args[i - 1] === '--level' || args[i - 1] === '--repeat');
	if (!isValue && !known.has(a)) fail(`Unknown option ${a}. Known: ${[...known].join(' ')}`);
});
if (args.includes('--help')) {
	console.log('npm run bench -- [--json] [--level 1..9] [--repeat 1..20] [--compare]');
	process.exit(0);
}
const json = args.includes('--json');
const level = numberAfter('--level', 8, 1, 9);
const repeat = numberAfter('--repeat', 3, 1, 20);

if (!existsSync(join(root, 'node_modules', 'esbuild'))) {
	console.error('Installing packages first (npm ci) ...');
	// npm's own words go to stderr, so that --json prints nothing but JSON.
	execFileSync('npm', ['ci'], { cwd: root, stdio: ['ignore', 2, 2] });
}

const out = join(root, 'node_modules', '.cache', 'planish', 'bench.mjs');
const costOut = join(root, 'node_modules', '.cache', 'planish', 'bench-cost.mjs');
mkdirSync(dirname(out), { recursive: true });
const { build } = await import('esbuild');
for (const [name, outfile] of [
	['run.ts', out],
	['cost.ts', costOut]
]) {
	await build({
		entryPoints: [join(root, 'bench', name)],
		outfile,
		bundle: true,
		platform: 'node',
		format: 'esm',
		target: 'node20',
		logLevel: 'error',
		alias: { $lib: join(root, 'src', 'lib') }
	});
}
const { runStandard } = await import(pathToFileURL(out).href);
const { runCost } = await import(pathToFileURL(costOut).href);
const figures = runStandard(level, repeat);
// What a move of the demo's pod with all kinds of constraints costs against a plain one.
figures.constraints_cost = runCost(repeat);

let yardstick = null;
if (args.includes('--compare')) {
	const ready = existsSync(PYTHON) && spawnSync(PYTHON, ['-c', 'import numpy, scipy']).status === 0;
	if (!ready) fail('--compare needs NumPy and SciPy: apt-get install python3-numpy python3-scipy');
	const run = spawnSync(PYTHON, [join(root, 'bench', 'reference.py'), '--level', String(level)], {
		encoding: 'utf8',
		maxBuffer: 1 << 24
	});
	if (run.status !== 0) fail(`The yardstick failed:\n${run.stderr}`);
	yardstick = JSON.parse(run.stdout);
}

if (json) console.log(JSON.stringify(yardstick ? { ...figures, yardstick } : figures, null, 1));
else printTable();

function printTable() {
	const line = (name, value, extra = '') => console.log(`${name.padEnd(34)} ${String(value).padStart(22)}  ${extra}`);
	console.log(`Standard workload, level ${level}, median of ${repeat}`);
	for (const [name, value] of Object.entries(figures.seconds)) line(`  ${name}`, value.toFixed(4), 's');
	const same = yardstick
		? `yardstick ${yardstick.lattice_total} s, ratio ${(yardstick.lattice_total / figures.lattice_total).toFixed(1)}`
		: '';
	line('lattice_total', figures.lattice_total.toFixed(4), `s ${same}`);
	const { plain_seconds, constrained_seconds, ratio, binding_places } = figures.constraints_cost;
	line('demo: plain move', plain_seconds.toFixed(4), 's (one box, held volume)');
	const all = `s (three boxes, keep-out mesh, wall, held objective; binds at ${binding_places} places)`;
	line('demo: move with constraints', constrained_seconds.toFixed(4), `${all}, ratio ${ratio.toFixed(1)}`);
	for (const [name, value] of Object.entries(figures)) {
		if (name === 'seconds' || name === 'lattice_total' || name === 'constraints_cost') continue;
		const theirs = yardstick && typeof yardstick[name] === 'number' ? yardstick[name] : null;
		const difference =
			theirs === null || typeof value !== 'number' || theirs === 0 || name === 'total'
				? ''
				: `against yardstick ${((value - theirs) / theirs).toExponential(1)}`;
		line(name, value, difference);
	}
}
