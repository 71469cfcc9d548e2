import { beforeAll, describe, expect, it } from 'vitest';
import {
	makeSurface,
	nodalGradient,
	prepareMove,
	readStl,
	storePositions,
	toMetres,
	volumeOf,
	type Mesh,
	type MoveSolution,
	type Surface
} from '../../../src/lib/morph';
import { BOX, SMOOTHING, STEP, workloadDensity, workloadStl } from '../../../bench/workload';

/**
 * The standard workload at level 6 against an independent program in NumPy and SciPy (dense basis matrices, a direct
 * factorisation, no moments), run once.
 */
const INDEPENDENT = { inside: 19_591, predicted: -0.0205657, rms: 0.00442722 };

describe('the standard workload at level 6', () => {
	let mesh: Mesh;
	let surface: Surface;
	let gradient: Float64Array;
	let moments: MoveSolution;
	const solve = (path: 'direct' | 'moments') => {
		const prepared = prepareMove(surface, [BOX], { smoothing: SMOOTHING, path });
		expect(prepared.path).toBe(path);
		return prepared.solve({
			objectives: [{ id: 'workload', gradient, sense: 'minimise', weight: 1 }],
			step: STEP,
			constraints: [{ kind: 'volume', bound: 'hold' }]
		});
	};

	beforeAll(() => {
		mesh = readStl(workloadStl(6));
		surface = makeSurface(toMetres(mesh.positions, 1), mesh.triangles);
		const values = workloadDensity(surface.positions);
		gradient = nodalGradient({ kind: 'density', location: 'vertex', values, outward: 'raises' }, surface);
		moments = solve('moments');
	});

	it("gives the independent program's figures", () => {
		expect(moments.moved.length).toBe(INDEPENDENT.inside);
		expect(Math.abs(moments.predictedWeighted - INDEPENDENT.predicted)).toBeLessThan(6e-8);
		expect(Math.abs(moments.rmsDisplacement - INDEPENDENT.rms)).toBeLessThan(6e-9);
		expect(Math.abs(moments.volumeAfter / moments.volumeBefore - 1)).toBeLessThan(1e-10);
	});

	it('gives the same move by cells and by straight sums within 5e-8 of the step', () => {
		const direct = solve('direct');
		let worst = 0;
		direct.displacement.forEach((d, i) => (worst = Math.max(worst, Math.abs(d - moments.displacement[i]))));
		expect(worst).toBeLessThan(5e-8 * STEP);
	});

	it('stores it in float32 with the volume held to 1e-9 and every other bit as it was', () => {
		const stored = storePositions(mesh.positions, moments.moved, moments.displacement, {
			metresPerUnit: 1,
			triangles: mesh.triangles,
			targetVolume: surface.volume
		});
		const volume = volumeOf(toMetres(stored.positions, 1), mesh.triangles);
		expect(Math.abs(volume / surface.volume - 1)).toBeLessThan(1e-9);
		const inside = new Uint8Array(surface.mass.length);
		moments.moved.forEach((v) => (inside[v] = 1));
		let touched = 0;
		for (let i = 0; i < stored.positions.length; i++) {
			if (!inside[Math.floor(i / 3)] && !Object.is(stored.positions[i], mesh.positions[i])) touched++;
		}
		expect(touched).toBe(0);
	});
});
