import { existsSync } from 'node:fs';
import { join } from 'node:path';
import { FOREIGN_MESHES } from '../../scripts/lib/install.mjs';

/**
 * A mesh of Debian's openscad-testing-data, made by no one here: `import.stl` (ASCII), `import_bin.stl` (binary) and
 * `import_bin_solid.stl` (binary, its header begins with "solid").
 * @returns the file's path; throws with the command to run when the package is missing (npm test installs it)
 */
export function foreignMesh(name: 'import.stl' | 'import_bin.stl' | 'import_bin_solid.stl'): string {
	const path = join(process.env.PLANISH_FOREIGN_MESHES || FOREIGN_MESHES, name);
	if (existsSync(path)) return path;
	throw new Error(`${path} is missing. As root: apt-get install --no-install-recommends -y openscad-testing-data`);
}
