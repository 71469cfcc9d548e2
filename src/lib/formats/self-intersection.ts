import { selfIntersections as search } from '$lib/morph';
import type { HealthMesh } from './mesh-checks';

/**
 * Triangles that pass through others (the engine's search), within a budget of time.
 * @param budget milliseconds, after which the search ends and says how far it came
 * @param listed places named at most
 */
export function selfIntersections(
	mesh: HealthMesh,
	budget: number,
	listed: number
): { count: number; places: number[]; searched: number } {
	const begin = performance.now();
	const { hit, searched } = search(Float64Array.from(mesh.positions), mesh.triangles, {
		stop: () => performance.now() - begin > budget
	});
	const places: number[] = [];
	let count = 0;
	for (let t = 0; t < hit.length; t++) {
		if (!hit[t]) continue;
		count++;
		if (places.length < listed) places.push(t);
	}
	return { count, places, searched };
}
