import {
	applyDisplacement,
	checkMove,
	helmholtz,
	makeSurface,
	nodalGradient,
	prepareMove,
	readStl,
	solveSparse,
	storePositions,
	toMetres,
	writeStl
} from '../src/lib/morph';
import { BOX, SMOOTHING, STEP, workloadDensity, workloadStl } from './workload';

/** One run's figures, with the keys of reference.py where both have them. */
export interface BenchFigures {
	vertices: number;
	triangles: number;
	inside: number;
	control_points: number;
	seconds: Record<string, number>;
	lattice_total: number;
	total: number;
	volume: number;
	area: number;
	volume_after: number;
	predicted_change: number;
	max_displacement: number;
	rms_displacement: number;
	flipped: number;
	min_angle_deg: number;
	filtered_norm?: number;
	[key: string]: unknown;
}

const median = (values: number[]) => {
	const sorted = values.slice().sort((a, b) => a - b);
	const middle = sorted.length >> 1;
	return sorted.length % 2 ? sorted[middle] : (sorted[middle - 1] + sorted[middle]) / 2;
};
/** Not part of the lattice's move. */
const SURFACE_STAGES = ['laplacian', 'surface_filter'];
const round = (x: number) => Math.round(x * 1e4) / 1e4;

/** From the STL's bytes to the moved STL's bytes, once. */
function once(bytes: Uint8Array): {
	seconds: Record<string, number>;
	figures: Omit<BenchFigures, 'seconds' | 'lattice_total' | 'total'>;
} {
	const seconds: Record<string, number> = {};
	let clock = performance.now();
	const lap = (name?: string) => {
		const now = performance.now();
		if (name) seconds[name] = (now - clock) / 1000;
		clock = performance.now();
	};
	const mesh = readStl(bytes);
	lap('read_and_weld');
	const surface = makeSurface(toMetres(mesh.positions, 1), mesh.triangles);
	lap('geometry');
	// The yardstick does not time the making of the map either.
	const density = workloadDensity(surface.positions);
	const gradient = nodalGradient({ kind: 'density', location: 'vertex', values: density, outward: 'raises' }, surface);
	lap();
	const prepared = prepareMove(surface, [BOX], { smoothing: SMOOTHING });
	lap('embed_and_metric');
	const solution = prepared.solve({
		objectives: [{ id: 'standard', gradient, sense: 'minimise', weight: 1 }],
		step: STEP,
		constraints: [{ kind: 'volume', bound: 'hold' }]
	});
	lap('project_solve_displace_hold');
	const stored = storePositions(mesh.positions, solution.moved, solution.displacement, {
		metresPerUnit: 1,
		triangles: mesh.triangles,
		targetVolume: surface.volume
	});
	lap('store');
	const after = applyDisplacement(surface.positions, solution.moved, solution.displacement);
	const checks = checkMove({ before: surface.positions, after, triangles: mesh.triangles });
	lap('quality');
	writeStl({ ...mesh, positions: stored.positions }, { encoding: 'binary' });
	lap('write');
	// The second half: the same descent in surface mode, where every vertex is free.
	const every = Int32Array.from(surface.mass, (_, v) => v);
	lap();
	const matrix = helmholtz(surface.positions, surface.triangles, every, surface.mass, SMOOTHING);
	lap('laplacian');
	const smooth = solveSparse(
		matrix,
		density.map((s, v) => s * surface.mass[v]),
		1e-8
	);
	lap('surface_filter');
	return {
		seconds,
		figures: {
			vertices: mesh.positions.length / 3,
			triangles: mesh.triangles.length / 3,
			inside: solution.moved.length,
			control_points: BOX.lattice[0] * BOX.lattice[1] * BOX.lattice[2],
			volume: surface.volume,
			area: surface.area,
			volume_after: stored.volume,
			predicted_change: solution.predicted[0].change,
			max_displacement: solution.maxDisplacement,
			rms_displacement: solution.rmsDisplacement,
			flipped: checks.flipped.value,
			min_angle_deg: checks.minAngle.value,
			path: prepared.path,
			volume_after_float64: solution.volumeAfter,
			nudges: stored.nudges,
			filtered_norm: Math.sqrt(smooth.reduce((sum, x, v) => sum + surface.mass[v] * x * x, 0))
		}
	};
}

/** Medians over the repeats; the figures of the last run. */
export function runStandard(level: number, repeat: number): BenchFigures {
	const bytes = workloadStl(level);
	const runs = Array.from({ length: repeat }, () => once(bytes));
	const last = runs[runs.length - 1];
	const seconds: Record<string, number> = {};
	for (const name of Object.keys(last.seconds)) seconds[name] = round(median(runs.map((r) => r.seconds[name])));
	const sum = (s: Record<string, number>, skipped: string[]) =>
		Object.entries(s).reduce((total, [name, value]) => (skipped.includes(name) ? total : total + value), 0);
	const lattice_total = round(median(runs.map((r) => sum(r.seconds, SURFACE_STAGES))));
	const total = round(median(runs.map((r) => sum(r.seconds, []))));
	return { ...last.figures, seconds, lattice_total, total } as BenchFigures;
}
