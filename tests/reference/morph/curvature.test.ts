import { describe, expect, it } from 'vitest';
import { CurvatureProbe, smallestRadii } from '$lib/morph';
import { gridSurface, icosphere } from '../../unit/morph/shapes';

type Mesh = { positions: Float64Array; triangles: Uint32Array };

/** A reproducible stream of numbers in [-1/2, 1/2) (Park and Miller, Communications of the ACM 31, 1988). */
function stream(seed: number) {
	let x = seed;
	return () => (x = (x * 48271) % 2147483647) / 2147483647 - 0.5;
}
const all = (n: number) => Uint32Array.from({ length: n }, (_, v) => v);

/** The icosphere's vertices shaken by up to half an edge and put back onto the sphere. */
function shakenSphere(level: number): Mesh {
	const { positions, triangles } = icosphere(level);
	const next = stream(5);
	const shaken = positions.map((x) => x + (0.55 / 2 ** level) * next());
	for (let v = 0; v < shaken.length; v += 3) {
		const length = Math.hypot(shaken[v], shaken[v + 1], shaken[v + 2]);
		for (let d = 0; d < 3; d++) shaken[v + d] /= length;
	}
	return { positions: shaken, triangles };
}

/** A torus (R 2, r 0.5) with its vertices shaken along it. */
function shakenTorus(nu: number, nv: number): Mesh {
	const next = stream(9);
	return gridSurface(nu, nv, (u, v) => {
		const a = 2 * Math.PI * (u + (0.6 * next()) / nu);
		const b = 2 * Math.PI * (v + (0.6 * next()) / nv);
		return [(2 + 0.5 * Math.cos(b)) * Math.cos(a), (2 + 0.5 * Math.cos(b)) * Math.sin(a), 0.5 * Math.sin(b)];
	});
}

/** Largest and root mean square relative error of both curvatures, against the larger one's size. */
function errors({ positions, triangles }: Mesh, exact: (x: number, y: number, z: number) => [number, number]) {
	const n = positions.length / 3;
	const k = new CurvatureProbe(triangles, n, all(n)).at(positions);
	let max = 0;
	let sum = 0;
	for (let v = 0; v < n; v++) {
		const [k1, k2] = exact(positions[3 * v], positions[3 * v + 1], positions[3 * v + 2]);
		const size = Math.max(Math.abs(k1), Math.abs(k2));
		const error = Math.max(Math.abs(k.largest[v] - k1), Math.abs(k.smallest[v] - k2)) / size;
		max = Math.max(max, error);
		sum += error * error;
	}
	return { max, rms: Math.sqrt(sum / n) };
}

describe('principal curvatures on irregular meshes against closed forms, falling with the mesh', () => {
	it('sphere: 1 / R twice', () => {
		const [coarse, fine] = [3, 5].map((level) => errors(shakenSphere(level), () => [1, 1]));
		expect(fine.max).toBeLessThan(0.005);
		expect(coarse.rms / fine.rms).toBeGreaterThan(10);
	});

	// do Carmo, Differential Geometry of Curves and Surfaces, 1976, section 3-3 (from memory): 1/r and cos v / (R + r cos v).
	it('torus (R 2, r 0.5): 1 / r and cos v / rho, the inner side a saddle', () => {
		const exact = (x: number, y: number): [number, number] => {
			const rho = Math.hypot(x, y);
			return [2, (rho - 2) / 0.5 / rho];
		};
		const [coarse, fine] = [1, 4].map((k) => errors(shakenTorus(48 * k, 20 * k), exact));
		expect(fine.max).toBeLessThan(0.03);
		expect(fine.rms).toBeLessThan(0.01);
		expect(coarse.rms / fine.rms).toBeGreaterThan(8);
	});

	// Gauss and mean curvature from the support function, with 1/h^2 = x^2/a^4 + y^2/b^4 + z^2/c^4: K = h^4/(abc)^2 and
	// H = h^3 (a^2 + b^2 + c^2 - x^2 - y^2 - z^2) / (2 (abc)^2) (standard formulas, from memory; a sphere gives 1/R).
	it('ellipsoid 2, 1, 0.7', () => {
		const axes = [2, 1, 0.7];
		const exact = (x: number, y: number, z: number): [number, number] => {
			const inverse = x ** 2 / 2 ** 4 + y ** 2 + z ** 2 / 0.7 ** 4;
			const product = (2 * 0.7) ** 2;
			const gauss = 1 / (product * inverse ** 2);
			const mean = (4 + 1 + 0.49 - x * x - y * y - z * z) / (2 * product * inverse ** 1.5);
			const half = Math.sqrt(Math.max(0, mean * mean - gauss));
			return [mean + half, mean - half];
		};
		const [coarse, fine] = [4, 6].map((level) => {
			const { positions, triangles } = shakenSphere(level);
			return errors({ positions: positions.map((x, i) => x * axes[i % 3]), triangles }, exact);
		});
		expect(fine.max).toBeLessThan(0.04);
		expect(fine.rms).toBeLessThan(0.005);
		expect(coarse.rms / fine.rms).toBeGreaterThan(3);
	});

	it('an open cylinder: 1 / R and 0, at its rims too', () => {
		const [nu, nv] = [40, 60];
		const next = stream(3);
		const points: number[] = [];
		const triangles: number[] = [];
		for (let i = 0; i <= nu; i++) {
			for (let j = 0; j < nv; j++) {
				const a = (2 * Math.PI * (j + 0.5 * next())) / nv;
				points.push((4 * (i + (i > 0 && i < nu ? 0.5 * next() : 0))) / nu, Math.cos(a), Math.sin(a));
				const [p, q] = [i * nv + j, i * nv + ((j + 1) % nv)];
				if (i < nu) triangles.push(p, q, q + nv, p, q + nv, p + nv);
			}
		}
		const n = points.length / 3;
		const mesh = { positions: Float64Array.from(points), triangles: Uint32Array.from(triangles) };
		const k = new CurvatureProbe(mesh.triangles, n, all(n)).at(mesh.positions);
		for (let v = 0; v < n; v++) {
			expect(Math.abs(Math.abs(k.largest[v]) - 1) < 0.05 || Math.abs(Math.abs(k.smallest[v]) - 1) < 0.05).toBe(true);
			expect(Math.min(Math.abs(k.largest[v]), Math.abs(k.smallest[v]))).toBeLessThan(0.05);
		}
	});

	it('tells convex from concave, and finds the place', () => {
		const { positions, triangles } = shakenTorus(160, 80);
		const n = positions.length / 3;
		const { convex, concave } = smallestRadii(all(n), new CurvatureProbe(triangles, n, all(n)).at(positions));
		expect(convex.radius).toBeGreaterThan(0.48);
		expect(convex.radius).toBeLessThan(0.502);
		// Around the hole: rho = R - r = 1.5, radius rho.
		expect(concave.radius).toBeGreaterThan(1.4);
		expect(concave.radius).toBeLessThan(1.6);
		expect(Math.hypot(positions[3 * concave.vertex], positions[3 * concave.vertex + 1])).toBeLessThan(1.55);
		const ball = icosphere(3);
		const m = ball.positions.length / 3;
		const inward = ball.triangles.slice().reverse();
		const hollow = smallestRadii(all(m), new CurvatureProbe(inward, m, all(m)).at(ball.positions));
		expect(hollow.convex.vertex).toBe(-1);
		expect(hollow.concave.radius).toBeCloseTo(1, 1);
	});

	it('says nothing where the mesh determines nothing', () => {
		const k = new CurvatureProbe(Uint32Array.of(0, 1, 2), 3, all(3)).at(Float64Array.of(0, 0, 0, 1, 0, 0, 0, 1, 0));
		expect([...k.largest].every(Number.isNaN)).toBe(true);
	});
});
