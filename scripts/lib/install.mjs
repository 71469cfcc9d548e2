// What the project needs from outside: npm's packages, and Debian's.
import { accessSync, constants, existsSync, mkdirSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { withLock } from './lock.mjs';
import { must, run } from './processes.mjs';
import { Trouble, lastLines, note } from './say.mjs';
import { ROOT } from './settings.mjs';

/** Whether node_modules holds exactly what package-lock.json says, by the list that npm itself leaves there last. */
export function packagesAreCurrent() {
	const wanted = JSON.parse(readFileSync(join(ROOT, 'package-lock.json'), 'utf8')).packages;
	const path = join(ROOT, 'node_modules', '.package-lock.json');
	if (!existsSync(path)) return false;
	const present = JSON.parse(readFileSync(path, 'utf8')).packages;
	return (
		Object.entries(wanted).every(([name, entry]) => {
			if (name === '') return true;
			// Optional ones are for other machines, or not.
			if (!present[name]) return Boolean(entry.optional);
			return present[name].version === entry.version && present[name].integrity === entry.integrity;
		}) && Object.keys(present).every((name) => wanted[name])
	);
}

/** Installs npm's packages when they are missing or the lock file changed. */
export async function ensurePackages() {
	const [major, minor] = process.versions.node.split('.').map(Number);
	if (major < 20 || (major === 20 && minor < 12)) {
		throw new Trouble(`This is Node ${process.version}. Planish needs Node 20.12 or later.`);
	}
	if (packagesAreCurrent()) return;
	try {
		accessSync(ROOT, constants.W_OK);
	} catch {
		throw new Trouble(`The packages must be installed, but ${ROOT} cannot be written. As its owner, run: npm ci`);
	}
	// Not in node_modules: npm ci empties that.
	mkdirSync(join(ROOT, '.svelte-kit'), { recursive: true });
	await withLock(join(ROOT, '.svelte-kit', 'install.lock'), async () => {
		if (packagesAreCurrent()) return;
		note('Installing the packages (npm ci) ...');
		// The build needs the development packages too, whatever NODE_ENV says.
		await must('npm ci failed', 'npm', ['ci', '--include=dev', '--no-audit', '--no-fund'], { cwd: ROOT });
	});
}

let listsUpdated = false;

/**
 * Installs packages of Debian as root; any other user gets the command to run.
 * @param {string[]} packages
 * @param {string} what what is missing, as the beginning of a sentence
 */
export async function installDebian(packages, what) {
	const command = `apt-get update && apt-get install --no-install-recommends -y ${packages.join(' ')}`;
	if (!existsSync('/usr/bin/apt-get')) {
		throw new Trouble(`${what} is missing, and this is not a Debian system. Install: ${packages.join(' ')}`);
	}
	if (process.getuid?.() !== 0) {
		throw new Trouble(`${what} is missing, and only root can install it. As root, run:\n\n    ${command}\n`);
	}
	note(`Installing ${packages.join(', ')} from Debian's packages ...`);
	const env = { ...process.env, DEBIAN_FRONTEND: 'noninteractive' };
	const wait = ['-o', 'DPkg::Lock::Timeout=300'];
	let output = '';
	if (!listsUpdated) {
		const update = await run('/usr/bin/apt-get', [...wait, 'update', '-q'], { env });
		output = update.output;
		listsUpdated = update.code === 0;
	}
	const install = await run(
		'/usr/bin/apt-get',
		[...wait, '-o', 'Dpkg::Options::=--force-confold', 'install', '--no-install-recommends', '-y', '-q', ...packages],
		{ env }
	);
	output += install.output;
	if (install.code !== 0) {
		throw new Trouble(`${what} could not be installed. The command was:\n\n    ${command}\n\n${lastLines(output, 15)}`);
	}
}

/** PostgreSQL's server; Debian's packaging must not make and start a cluster of its own, which nobody asked for. */
export async function installPostgres() {
	const folder = '/etc/postgresql-common/createcluster.d';
	const file = join(folder, 'planish.conf');
	const root = process.getuid?.() === 0;
	try {
		if (root) {
			mkdirSync(folder, { recursive: true });
			writeFileSync(file, 'create_main_cluster = false\n');
		}
		await installDebian(['postgresql'], 'PostgreSQL');
	} finally {
		if (root) rmSync(file, { force: true });
	}
}

/**
 * The browser for the end-to-end tests: PLANISH_CHROMIUM, or Debian's, with a font so that text has a width.
 * @returns {Promise<string>} the program's path
 */
export async function ensureChromium() {
	const chosen = process.env.PLANISH_CHROMIUM;
	if (chosen) {
		if (!existsSync(chosen)) throw new Trouble(`PLANISH_CHROMIUM is "${chosen}", which does not exist.`);
		return chosen;
	}
	const missing = [];
	if (!existsSync('/usr/bin/chromium')) missing.push('chromium');
	if (!existsSync('/usr/share/fonts/truetype/dejavu/DejaVuSans.ttf')) missing.push('fonts-dejavu-core');
	if (missing.length > 0) await installDebian(missing, 'What the browser tests need');
	return '/usr/bin/chromium';
}

/** Where Debian's openscad-testing-data keeps the STL files that the tests read. */
export const FOREIGN_MESHES = '/usr/share/openscad/testdata/scad/3D/features';

/**
 * Meshes that no one here made, for the tests.
 * @returns {Promise<string>} their folder
 */
export async function ensureForeignMeshes() {
	if (process.env.PLANISH_FOREIGN_MESHES) return process.env.PLANISH_FOREIGN_MESHES;
	const wanted = 'import_bin_solid.stl';
	if (existsSync(join(FOREIGN_MESHES, wanted))) return FOREIGN_MESHES;
	if (process.getuid?.() === 0) {
		await installDebian(['openscad-testing-data'], 'The set of foreign meshes');
		return FOREIGN_MESHES;
	}
	// An ordinary user may still fetch the package and unpack it in a folder of its own.
	const cache = join(ROOT, '.svelte-kit', 'foreign-meshes');
	const folder = join(cache, FOREIGN_MESHES);
	if (existsSync(join(folder, wanted))) return folder;
	mkdirSync(cache, { recursive: true });
	const fetched = await run('sh', ['-c', 'apt-get download openscad-testing-data && dpkg-deb -x openscad-*.deb .'], {
		cwd: cache
	});
	if (fetched.code !== 0 || !existsSync(join(folder, wanted))) {
		await installDebian(['openscad-testing-data'], 'The set of foreign meshes');
	}
	return folder;
}
