import { describe, expect, it } from 'vitest';
import { makeSurface, prepareThickness } from '$lib/morph';
import { icosphere } from '../../unit/morph/shapes';

describe('thickness of shells in closed form', () => {
	it('concentric spheres: R - r, within the sagittas of both; second order in the mesh', () => {
		const worst = [3, 4, 5].map((level) => {
			const { positions, triangles } = icosphere(level);
			const n = positions.length / 3;
			const surface = makeSurface(
				Float64Array.from({ length: 6 * n }, (_, i) => (i < 3 * n ? positions[i] : 0.95 * positions[i - 3 * n])),
				Uint32Array.from({ length: 2 * triangles.length }, (_, i) => {
					const k = i - triangles.length;
					return k < 0 ? triangles[i] : n + triangles[k % 3 === 0 ? k : k % 3 === 1 ? k + 1 : k - 1];
				})
			);
			const t = prepareThickness(surface, 0.01).thickness(
				surface.positions,
				Uint32Array.from({ length: n }, (_, v) => v)
			);
			return Math.max(...t.map((x) => Math.abs(x - 0.05)));
		});
		expect(worst[2]).toBeLessThan(2e-3);
		expect(worst[0] / worst[1]).toBeGreaterThan(3);
		expect(worst[1] / worst[2]).toBeGreaterThan(3);
	});

	it('a solid sphere: 2 R along every ray', () => {
		const { positions, triangles } = icosphere(5);
		const surface = makeSurface(positions, triangles);
		const t = prepareThickness(surface, 0.01).thickness(
			surface.positions,
			Uint32Array.from({ length: positions.length / 3 }, (_, v) => v)
		);
		for (const x of t) expect(Math.abs(x - 2)).toBeLessThan(1e-3);
	});

	it('a wedge of half angle a, s from its edge: s sin 2a / cos 2a, the ray being square to one side', () => {
		const a = 0.15;
		const n = 40;
		// Sides z = +-x tan a, x in [0, 1], y in [0, 2]; closed by a back at x = 1 and two ends: only the sides are asked.
		const points: number[] = [];
		const triangles: number[] = [];
		for (const side of [1, -1]) {
			const base = points.length / 3;
			for (let i = 0; i <= n; i++)
				for (let j = 0; j <= n; j++) points.push(i / n, (2 * j) / n, (side * i * Math.tan(a)) / n);
			for (let i = 0; i < n; i++) {
				for (let j = 0; j < n; j++) {
					const p = base + i * (n + 1) + j;
					const q = [p, p + n + 1, p + n + 2, p, p + n + 2, p + 1];
					triangles.push(...(side === 1 ? q : q.reverse()));
				}
			}
		}
		const surface = makeSurface(Float64Array.from(points), Uint32Array.from(triangles));
		const inner: number[] = [];
		for (let i = 2; i < 20; i++) for (let j = 5; j < n - 5; j++) inner.push(i * (n + 1) + j);
		const t = prepareThickness(surface, 0.01).thickness(surface.positions, Uint32Array.from(inner));
		inner.forEach((v, k) => {
			const s = surface.positions[3 * v] / Math.cos(a);
			expect(t[k]).toBeCloseTo((2 * s * Math.sin(a) * Math.cos(a)) / Math.cos(2 * a), 12);
		});
	});
});
