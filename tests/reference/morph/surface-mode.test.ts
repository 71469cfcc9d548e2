import { describe, expect, it } from 'vitest';
import { helmholtz, solveSparse } from '../../../src/lib/morph/laplacian';
import { makeSurface, prepareMove, type MoveObjective } from '../../../src/lib/morph';
import { workloadDensity } from '../../../bench/workload';
import { ellipsoid, icosphere, makeBox } from '../../unit/morph/shapes';

const whole = (n: number) => Int32Array.from({ length: n }, (_, i) => i);
const sphere = (level: number) => {
	const { positions, triangles } = icosphere(level);
	return makeSurface(positions, triangles);
};

/** Real spherical harmonics of degrees 1, 2 and 3 up to a factor (any handbook). */
const harmonics: [number, (x: number, y: number, z: number) => number][] = [
	[1, (_x, _y, z) => z],
	[2, (x, y) => x * y],
	[3, (_x, _y, z) => z * (5 * z * z - 3)]
];

describe('the cotangent Laplacian on the unit sphere', () => {
	// Spectrum l (l + 1) of the Laplace-Beltrami operator: textbook. With lumped masses the Rayleigh quotient of a harmonic
	// approaches it with the square of the edge.
	it.each(harmonics)('has the eigenvalue l (l + 1) for l = %i', (l, harmonic) => {
		const errors = [3, 4, 5].map((level) => {
			const { positions, triangles, mass } = sphere(level);
			const n = mass.length;
			const energy = helmholtz(positions, triangles, whole(n), new Float64Array(n), 1);
			const f = Float64Array.from(mass, (_, v) =>
				harmonic(...(Array.from(positions.subarray(3 * v, 3 * v + 3)) as [number, number, number]))
			);
			let above = 0;
			let below = 0;
			for (let i = 0; i < n; i++) {
				let sum = energy.diagonal[i] * f[i];
				for (let k = energy.starts[i]; k < energy.starts[i + 1]; k++) sum += energy.values[k] * f[energy.columns[k]];
				above += f[i] * sum;
				below += mass[i] * f[i] * f[i];
			}
			return Math.abs(above / below - l * (l + 1)) / (l * (l + 1));
		});
		expect(errors[2]).toBeLessThan(1e-2);
		// On this mesh the linear harmonics are exact.
		if (l === 1) return expect(errors[0]).toBeLessThan(1e-4);
		expect(errors[0] / errors[1]).toBeGreaterThan(3.5);
		expect(errors[1] / errors[2]).toBeGreaterThan(3.5);
	});

	// (1 - r^2 Laplacian) u = f has the gain 1 / (1 + r^2 l (l + 1)) on a harmonic: follows from the spectrum.
	it.each([0.3, 1])('smooths by 1 / (1 + r^2 l (l + 1)) at r = %f', (r) => {
		const { positions, triangles, mass } = sphere(5);
		const n = mass.length;
		const matrix = helmholtz(positions, triangles, whole(n), mass, r);
		for (const [l, harmonic] of harmonics) {
			const f = Float64Array.from(mass, (_, v) =>
				harmonic(positions[3 * v], positions[3 * v + 1], positions[3 * v + 2])
			);
			const u = solveSparse(
				matrix,
				f.map((x, v) => x * mass[v]),
				1e-12
			);
			const inner = (a: Float64Array, b: Float64Array) => a.reduce((s, x, v) => s + x * b[v] * mass[v], 0);
			expect(inner(u, f) / inner(f, f) / (1 / (1 + r * r * l * (l + 1)))).toBeCloseTo(1, 2);
		}
	});

	it('gives the filtered norm of the standard workload at level 6', () => {
		const { positions, triangles, mass } = ellipsoid(6, [2.4, 0.9, 0.7]);
		const density = workloadDensity(positions);
		const matrix = helmholtz(positions, triangles, whole(mass.length), mass, 0.05);
		const u = solveSparse(
			matrix,
			density.map((s, v) => s * mass[v]),
			1e-10
		);
		const norm = Math.sqrt(u.reduce((s, x, v) => s + mass[v] * x * x, 0));
		// An independent NumPy and SciPy program (sparse cotangent Laplacian, scipy.sparse.linalg.cg to 1e-10), run once.
		expect(norm).toBeCloseTo(2.3601213675677, 9);
	});
});

describe('surface mode', () => {
	const surface = ellipsoid(5, [2.4, 0.9, 0.7]);
	const box = makeBox({ centre: [1, 0, 0.1], halfSize: [1, 1.1, 0.9], lattice: [6, 4, 4] });
	const density = workloadDensity(surface.positions);
	const objective: MoveObjective = {
		id: 'one',
		sense: 'minimise',
		weight: 1,
		gradient: surface.normals.map((n, i) => n * density[Math.floor(i / 3)] * surface.mass[Math.floor(i / 3)])
	};
	const prepared = prepareMove(surface, [box], { smoothing: 0.1, mode: 'surface' });
	const move = prepared.solve({
		objectives: [objective],
		step: 0.01,
		constraints: [{ kind: 'volume', bound: 'hold' }]
	});

	it('moves along the normals, fades at the faces and holds the volume', () => {
		expect(move.lattices).toEqual([]);
		expect(move.predictedWeighted).toBeLessThan(0);
		expect(move.constraints[0].kept).toBe(true);
		expect(Math.abs(move.volumeAfter / move.volumeBefore - 1)).toBeLessThan(1e-12);
		let across = 0;
		let atFaces = 0;
		move.moved.forEach((v, i) => {
			const d = move.displacement.subarray(3 * i, 3 * i + 3);
			const n = surface.normals.subarray(3 * v, 3 * v + 3);
			const along = d[0] * n[0] + d[1] * n[1] + d[2] * n[2];
			across = Math.max(across, Math.hypot(d[0] - along * n[0], d[1] - along * n[1], d[2] - along * n[2]));
			if (surface.positions[3 * v] < 0.02) atFaces = Math.max(atFaces, Math.hypot(d[0], d[1], d[2]));
		});
		expect(across).toBeLessThan(1e-15);
		expect(atFaces).toBeLessThan(1e-4 * 0.01);
	});

	it('carries less detail the longer the smoothing length', () => {
		const energy = (smoothing: number) => {
			const m = prepareMove(surface, [box], { smoothing, mode: 'surface' }).solve({
				objectives: [objective],
				step: 0.01,
				constraints: []
			});
			const slot = new Int32Array(surface.mass.length).fill(-1);
			m.moved.forEach((v, i) => (slot[v] = i));
			const along = Float64Array.from(m.moved, (v, i) =>
				[0, 1, 2].reduce((s, d) => s + m.displacement[3 * i + d] * surface.normals[3 * v + d], 0)
			);
			const l = helmholtz(surface.positions, surface.triangles, slot, new Float64Array(m.moved.length), 1);
			return along.reduce((s, x, i) => {
				let y = l.diagonal[i] * x;
				for (let k = l.starts[i]; k < l.starts[i + 1]; k++) y += l.values[k] * along[l.columns[k]];
				return s + x * y;
			}, 0);
		};
		expect(energy(0.1)).toBeLessThan(energy(0.02));
		expect(energy(0.3)).toBeLessThan(energy(0.1));
	});
});
