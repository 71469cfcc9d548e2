/** Patches as triangles, and locks as weights by vertex. */
import { lockWeights, type Patch, type Surface, type SurfaceLock } from '$lib/morph';
import type { Lock } from '$lib/api/schemas/drawn';

/** Triangles of some patches, ascending. */
export function patchTriangles(names: string[], patches: Patch[]): Uint32Array {
	const chosen = patches.filter((patch) => names.includes(patch.name));
	const out = new Uint32Array(chosen.reduce((sum, patch) => sum + patch.triangleCount, 0));
	let at = 0;
	for (const { firstTriangle, triangleCount } of chosen) {
		for (let k = 0; k < triangleCount; k++) out[at++] = firstTriangle + k;
	}
	return out.sort();
}

/** Weights in [0, 1] by vertex; undefined without locks. */
export function weightsOf(all: Lock[], patches: Patch[], { positions, triangles }: Surface): Float64Array | undefined {
	if (all.length === 0) return undefined;
	const locks = all.map(({ patches: names, painted, blend }): SurfaceLock => {
		const locked = new Set(patchTriangles(names, patches));
		const ranges = painted?.ranges ?? [];
		for (let i = 0; i + 1 < ranges.length; i += 2) {
			for (let k = 0; k < ranges[i + 1]; k++) locked.add(ranges[i] + k);
		}
		return { triangles: Uint32Array.from(locked).sort(), blend };
	});
	return lockWeights(positions, triangles, locks);
}
