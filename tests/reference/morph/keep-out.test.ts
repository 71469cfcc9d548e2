import { describe, expect, it } from 'vitest';
import { prepareKeepOut } from '$lib/morph';
import { gridSurface, icosphere } from '../../unit/morph/shapes';

/** A reproducible stream of numbers in [0, 1) (Park and Miller, Communications of the ACM 31, 1988). */
function stream(seed: number) {
	let x = seed;
	return () => (x = (x * 48271) % 2147483647) / 2147483647;
}

describe('distances to meshes against closed forms', () => {
	it('sphere: r - 1, within the sagitta of its triangles; the gradient is radial', () => {
		const sphere = icosphere(5);
		// Edge of the level 5 icosphere at most 0.0413; sagitta of a chord L^2 / 8 R, of a triangle L^2 / 6 R (circumradius L / sqrt 3).
		const sagitta = 0.0413 ** 2 / 6;
		const next = stream(7);
		const n = 4000;
		const points = Float64Array.from({ length: 3 * n }, () => 3 * next() - 1.5);
		const d = new Float64Array(n);
		const g = new Float64Array(3 * n);
		prepareKeepOut({ kind: 'mesh', ...sphere }, 'outside', 0).distance(points, n, 2, d, g);
		for (let i = 0; i < n; i++) {
			const p = points.subarray(3 * i, 3 * i + 3);
			const r = Math.hypot(...p);
			expect(d[i]).toBeGreaterThanOrEqual(r - 1 - 1e-12);
			expect(d[i]).toBeLessThanOrEqual(r - 1 + sagitta);
			expect(Math.hypot(...g.subarray(3 * i, 3 * i + 3))).toBeCloseTo(1, 9);
			if (Math.abs(r - 1) > 0.1 && r > 0.3) {
				const cosine = (g[3 * i] * p[0] + g[3 * i + 1] * p[1] + g[3 * i + 2] * p[2]) / r;
				expect(cosine).toBeGreaterThan(0.99);
			}
		}
	});

	it('torus (R 2, r 0.5): sqrt((rho - R)^2 + z^2) - r, in its hole too', () => {
		const torus = gridSurface(240, 96, (u, v) => {
			const [a, b] = [2 * Math.PI * u, 2 * Math.PI * v];
			return [(2 + 0.5 * Math.cos(b)) * Math.cos(a), (2 + 0.5 * Math.cos(b)) * Math.sin(a), 0.5 * Math.sin(b)];
		});
		const next = stream(11);
		const n = 4000;
		const points = Float64Array.from({ length: 3 * n }, (_, i) => (i % 3 === 2 ? 2 * next() - 1 : 6 * next() - 3));
		const d = new Float64Array(n);
		const g = new Float64Array(3 * n);
		prepareKeepOut({ kind: 'mesh', ...torus }, 'outside', 0).distance(points, n, 5, d, g);
		// Edges of at most 2.5 * 2 pi / 240 and 0.5 * 2 pi / 96: sagittas 0.00021 (over R + r) and 0.00027 (over r).
		for (let i = 0; i < n; i++) {
			const [x, y, z] = points.subarray(3 * i, 3 * i + 3);
			const exact = Math.hypot(Math.hypot(x, y) - 2, z) - 0.5;
			expect(Math.abs(d[i] - exact)).toBeLessThan(6e-4);
		}
		expect(d.some((x) => x < -0.1)).toBe(true);
	});

	it('agrees with every triangle looked at one by one (sign by the winding number)', () => {
		const { positions, triangles } = gridSurface(24, 10, (u, v) => {
			const [a, b] = [2 * Math.PI * u, 2 * Math.PI * v];
			const r = 0.4 + 0.15 * Math.cos(3 * a);
			return [(1 + r * Math.cos(b)) * Math.cos(a), (1 + r * Math.cos(b)) * Math.sin(a), r * Math.sin(b)];
		});
		const next = stream(3);
		const n = 600;
		const points = Float64Array.from({ length: 3 * n }, () => 3.4 * next() - 1.7);
		const d = new Float64Array(n);
		prepareKeepOut({ kind: 'mesh', positions, triangles }, 'outside', 0).distance(
			points,
			n,
			5,
			d,
			new Float64Array(3 * n)
		);
		for (let i = 0; i < n; i++) {
			const p = [...points.subarray(3 * i, 3 * i + 3)];
			let nearest = Infinity;
			let solidAngle = 0;
			for (let t = 0; t < triangles.length; t += 3) {
				const corner = [0, 1, 2].map((k) => [0, 1, 2].map((c) => positions[3 * triangles[t + k] + c] - p[c]));
				nearest = Math.min(nearest, distanceToOrigin(corner));
				solidAngle += angleOf(corner);
			}
			expect(Math.abs(d[i])).toBeCloseTo(nearest, 10);
			expect(d[i] < 0).toBe(solidAngle > 2 * Math.PI);
		}
	});
});

const dot = (a: number[], b: number[]) => a[0] * b[0] + a[1] * b[1] + a[2] * b[2];
const minus = (a: number[], b: number[]) => a.map((x, k) => x - b[k]);
const cross = (a: number[], b: number[]) =>
	[0, 1, 2].map((k) => a[(k + 1) % 3] * b[(k + 2) % 3] - a[(k + 2) % 3] * b[(k + 1) % 3]);

/** Solid angle of a triangle seen from the origin (Van Oosterom and Strackee, IEEE Trans. Biomed. Eng. 30, 1983). */
function angleOf([a, b, c]: number[][]): number {
	const [la, lb, lc] = [a, b, c].map((x) => Math.hypot(...x));
	return 2 * Math.atan2(dot(a, cross(b, c)), la * lb * lc + dot(a, b) * lc + dot(b, c) * la + dot(c, a) * lb);
}

/** Plain: the plane's foot when it lies inside, else the nearest of the three edges. */
function distanceToOrigin(corners: number[][]): number {
	const n = cross(minus(corners[1], corners[0]), minus(corners[2], corners[0]));
	const foot = n.map((x) => (x * dot(corners[0], n)) / dot(n, n));
	const inside = [0, 1, 2].every((k) => {
		const [a, b] = [corners[k], corners[(k + 1) % 3]];
		return dot(cross(minus(b, a), minus(foot, a)), n) >= 0;
	});
	if (inside) return Math.hypot(...foot);
	return Math.min(
		...[0, 1, 2].map((k) => {
			const [a, b] = [corners[k], corners[(k + 1) % 3]];
			const e = minus(b, a);
			const s = Math.min(1, Math.max(0, -dot(a, e) / dot(e, e)));
			return Math.hypot(...a.map((x, c) => x + s * e[c]));
		})
	);
}
