import { describe, expect, it } from 'vitest';
import { lockWeights, type MorphError } from '$lib/morph';
import { icosphere } from './shapes';

/** A flat sheet [0, 1]^2 of n x n squares; `shift` moves the inner vertices (fractions of a square) to make bad triangles. */
function sheet(n: number, shift: (i: number, j: number) => [number, number] = () => [0, 0]) {
	const positions = new Float64Array(3 * (n + 1) ** 2);
	for (let i = 0; i <= n; i++) {
		for (let j = 0; j <= n; j++) {
			const inner = i > 0 && j > 0 && i < n && j < n;
			const [a, b] = inner ? shift(i, j) : [0, 0];
			positions.set([(i + a) / n, (j + b) / n, 0], 3 * (i * (n + 1) + j));
		}
	}
	const triangles: number[] = [];
	for (let i = 0; i < n; i++) {
		for (let j = 0; j < n; j++) {
			const a = i * (n + 1) + j;
			triangles.push(a, a + n + 1, a + n + 2, a, a + n + 2, a + 1);
		}
	}
	return { positions, triangles: Uint32Array.from(triangles) };
}
const smooth = (t: number) => 6 * t ** 5 - 15 * t ** 4 + 10 * t ** 3;
/** The triangles of the sheet's first column, x <= 1 / n. */
const column = (n: number) => Uint32Array.from({ length: 2 * n }, (_, k) => k);

describe('lockWeights', () => {
	it('is 0 at every vertex of a locked triangle, 1 beyond the blend distance, the smoothstep between', () => {
		const n = 20;
		const { positions, triangles } = sheet(n);
		const w = lockWeights(positions, triangles, [{ triangles: column(n), blend: 0.4 }]);
		for (let v = 0; v < w.length; v++) {
			const t = (positions[3 * v] - 1 / n) / 0.4;
			if (t <= 1e-9) expect(w[v]).toBe(0);
			else if (t >= 1 + 1e-9) expect(w[v]).toBe(1);
			else expect(w[v]).toBeCloseTo(smooth(t), 9);
		}
	});

	it('several locks multiply; no lock is weight 1; blend 0 is a hard edge', () => {
		const { positions, triangles } = sheet(10);
		const a = { triangles: Uint32Array.of(0), blend: 0.5 };
		const b = { triangles: Uint32Array.of(triangles.length / 3 - 1), blend: 0.9 };
		const [wa, wb, both] = [[a], [b], [a, b]].map((locks) => lockWeights(positions, triangles, locks));
		for (let v = 0; v < both.length; v++) expect(both[v]).toBeCloseTo(wa[v] * wb[v], 15);
		expect(lockWeights(positions, triangles, []).every((w) => w === 1)).toBe(true);
		const hard = lockWeights(positions, triangles, [{ triangles: Uint32Array.of(0), blend: 0 }]);
		expect([...hard].filter((w) => w === 0)).toHaveLength(3);
		expect([...hard].filter((w) => w === 1)).toHaveLength(hard.length - 3);
	});

	it('obtuse corners do not spoil the distance: a sheared sheet of 150 degree triangles', () => {
		const n = 40;
		const shear = 1.7;
		const { positions, triangles } = sheet(n);
		for (let v = 0; v < positions.length; v += 3) positions[v + 1] += shear * positions[v];
		const w = lockWeights(positions, triangles, [{ triangles: column(n), blend: 0.5 }]);
		let worst = 0;
		let compared = 0;
		for (let v = 0; v < w.length; v++) {
			const x = positions[3 * v];
			// Where the foot of the perpendicular lies on the locked column, and away from the sheet's slanting ends.
			const y = positions[3 * v + 1];
			if (y < 0.1 || y > 0.95 || x < 1 / n) continue;
			compared++;
			const distance = x - 1 / n;
			worst = Math.max(worst, Math.abs(w[v] - (distance >= 0.5 ? 1 : smooth(distance / 0.5))));
		}
		expect(compared).toBeGreaterThan(300);
		expect(worst).toBeLessThan(0.02);
	});

	it('runs along the surface, not through the air', () => {
		const { positions, triangles } = icosphere(5);
		// The triangle at the pole (0, 0, 1)-most: weights follow the arc length.
		let top = 0;
		const height = (t: number) => [0, 1, 2].reduce((s, k) => s + positions[3 * triangles[3 * t + k] + 2], 0);
		for (let t = 1; t < triangles.length / 3; t++) if (height(t) > height(top)) top = t;
		const w = lockWeights(positions, triangles, [{ triangles: Uint32Array.of(top), blend: 3 }]);
		let worst = 0;
		for (let v = 0; v < w.length; v++) {
			const nearest = Math.min(
				...[0, 1, 2].map((k) => {
					const a = 3 * triangles[3 * top + k];
					const dot =
						positions[a] * positions[3 * v] +
						positions[a + 1] * positions[3 * v + 1] +
						positions[a + 2] * positions[3 * v + 2];
					return Math.acos(Math.max(-1, Math.min(1, dot)));
				})
			);
			worst = Math.max(worst, Math.abs(w[v] - smooth(Math.min(1, nearest / 3))));
		}
		expect(worst).toBeLessThan(0.03);
	});

	it('refuses triangles that do not exist and blends that are no length', () => {
		const { positions, triangles } = sheet(2);
		const codes = [
			[{ triangles: Uint32Array.of(99), blend: 1 }],
			[{ triangles: Uint32Array.of(0), blend: -1 }],
			[{ triangles: Uint32Array.of(0), blend: NaN }]
		].map((locks) => {
			try {
				return lockWeights(positions, triangles, locks);
			} catch (error) {
				return (error as MorphError).code;
			}
		});
		expect(codes).toEqual(['lock-invalid', 'lock-invalid', 'lock-invalid']);
	});
});
