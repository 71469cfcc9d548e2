import { describe, expect, it } from 'vitest';
import {
	controlPoints,
	makeSurface,
	pointIndex,
	prepareMove,
	surfaceMeasures,
	type DesignBox
} from '../../../src/lib/morph';
import { revolve, between } from '../../factories/revolution';
import { cube, gridSurface, icosphere, makeBox } from '../../unit/morph/shapes';

type Mesh = { positions: Float64Array; triangles: Uint32Array };
type Profile = [number, number][];

const off = (found: number, wanted: number) => Math.abs(found / wanted - 1);
const SECTORS = 720;

/** Area and volume, which the page's measures and the move's surface must agree on. */
function measured({ positions, triangles }: Mesh): { area: number; volume: number } {
	const surface = makeSurface(positions, triangles);
	const measures = surfaceMeasures(positions, triangles);
	expect(measures.closed).toBe(true);
	expect(off(measures.area, surface.area)).toBeLessThan(2e-12);
	expect(off(measures.volume, surface.volume)).toBeLessThan(2e-12);
	// Euler: V is homogeneous of degree 3 in the vertices.
	const sum = surface.volumeGradient.reduce((s, g, i) => s + g * (positions[i] - surface.origin[i % 3]), 0);
	expect(off(sum, 3 * surface.volume)).toBeLessThan(1e-12);
	expect(
		off(
			surface.mass.reduce((s, m) => s + m, 0),
			surface.area
		)
	).toBeLessThan(2e-12);
	return { area: surface.area, volume: surface.volume };
}

const PHI = (1 + Math.sqrt(5)) / 2;

describe('areas and volumes', () => {
	const tetrahedron: Mesh = {
		positions: Float64Array.of(1, 1, 1, 1, -1, -1, -1, 1, -1, -1, -1, 1).map((x) => x / Math.sqrt(8)),
		triangles: Uint32Array.of(0, 1, 2, 0, 3, 1, 0, 2, 3, 1, 3, 2)
	};
	const octahedron: Mesh = {
		positions: Float64Array.of(1, 0, 0, -1, 0, 0, 0, 1, 0, 0, -1, 0, 0, 0, 1, 0, 0, -1).map((x) => x / Math.sqrt(2)),
		triangles: Uint32Array.of(0, 2, 4, 2, 1, 4, 1, 3, 4, 3, 0, 4, 2, 0, 5, 1, 2, 5, 3, 1, 5, 0, 3, 5)
	};
	const icosahedron = icosphere(0);
	// The unit icosphere's corners lie on the unit sphere; edge 1 is at the circumradius sqrt(phi^2 + 1) / 2.
	icosahedron.positions = icosahedron.positions.map((x) => (x * Math.sqrt(PHI * PHI + 1)) / 2);

	it.each([
		['tetrahedron', tetrahedron, 1.73205080757, 0.117851130198],
		['octahedron', octahedron, 3.46410161514, 0.471404520791],
		['icosahedron', icosahedron, 8.66025403784, 2.18169499062],
		['cube', cube(3), 6, 1]
	])('%s of edge 1 (textbook)', (_, mesh, area, volume) => {
		const found = measured(mesh);
		expect(off(found.area, area)).toBeLessThan(1e-11);
		expect(off(found.volume, volume)).toBeLessThan(1e-11);
	});

	it.each([
		[2, 12.3298486, 4.0470447],
		[3, 12.5064927, 4.1527408],
		[4, 12.5513539, 4.1797389]
	])('unit icosphere of level %i (an independent program, run once)', (level, area, volume) => {
		const found = measured(icosphere(level));
		expect(Math.abs(found.area - area)).toBeLessThan(1e-7);
		expect(Math.abs(found.volume - volume)).toBeLessThan(1e-7);
	});

	it('torus 2, 0.5 by Pappus: 4 pi^2 R r, 2 pi^2 R r^2', () => {
		const errors = [1, 2].map((k) => {
			const torus = gridSurface(120 * k, 60 * k, (s, t) => {
				const r = 2 + 0.5 * Math.cos(2 * Math.PI * t);
				return [r * Math.cos(2 * Math.PI * s), r * Math.sin(2 * Math.PI * s), 0.5 * Math.sin(2 * Math.PI * t)];
			});
			const { area, volume } = measured(torus);
			return [off(area, 39.4784176044), off(volume, 9.86960440109)];
		});
		for (const q of [0, 1]) {
			expect(errors[1][q]).toBeLessThan(2e-3);
			expect(errors[0][q] / errors[1][q]).toBeGreaterThan(3.9);
		}
	});

	it('frustum of radii 5 and 2, height 4: 64 pi, 52 pi (textbook)', () => {
		const { area, volume } = measured(
			revolve(
				[
					[0, 0],
					[0, 5],
					[4, 2],
					[4, 0]
				],
				SECTORS
			)
		);
		expect(off(area, 64 * Math.PI)).toBeLessThan(3e-5);
		expect(off(volume, 52 * Math.PI)).toBeLessThan(3e-5);
	});

	it('spherical cap of radius 1 and height 0.5: area pi and its base, volume 0.654498469498 (textbook)', () => {
		const arc: Profile = Array.from({ length: 241 }, (_, k) => {
			const t = (Math.PI / 3) * (k / 240);
			return [1 - Math.cos(t), k === 0 ? 0 : Math.sin(t)];
		});
		const { area, volume } = measured(revolve([...arc, [arc[240][0], 0]], SECTORS));
		expect(off(area, Math.PI + 0.75 * Math.PI)).toBeLessThan(3e-5);
		expect(off(volume, 0.654498469498)).toBeLessThan(5e-5);
	});

	it.each([
		['prolate 1, 1, 2', [1, 1, 2], 21.4784353279, 8.37758040957],
		['prolate 1, 1, 3', [1, 1, 3], 30.8937239751, 12.5663706144],
		['oblate 2, 2, 1', [2, 2, 1], 34.6875308134, 16.7551608191],
		['oblate 3, 3, 1', [3, 3, 1], 68.2961867804, 37.6991118431],
		['1, 2, 3', [1, 2, 3], 48.8821463026, 25.1327412287]
	])('ellipsoid %s (closed forms: MathWorld; the last by elliptic integrals)', (_, axes, area, volume) => {
		const errors = [4, 5].map((level) => {
			const mesh = icosphere(level);
			const found = measured({ ...mesh, positions: mesh.positions.map((x, i) => x * axes[i % 3]) });
			return [off(found.area, area), off(found.volume, volume)];
		});
		for (const q of [0, 1]) {
			expect(errors[1][q]).toBeLessThan(3e-3);
			expect(errors[0][q] / errors[1][q]).toBeGreaterThan(3.7);
		}
	});

	it('Sears-Haack body of length 10, radius 0.5: 3 pi^2 / 16 R^2 L (Sears 1947, Haack 1941)', () => {
		const profile: Profile = Array.from({ length: 801 }, (_, k) => {
			const s = 0.5 - 0.5 * Math.cos((Math.PI * k) / 800);
			return [10 * s, k === 0 || k === 800 ? 0 : 0.5 * (4 * s * (1 - s)) ** 0.75];
		});
		const { area, volume } = measured(revolve(profile, SECTORS));
		expect(off(volume, 4.62637706295)).toBeLessThan(3e-5);
		// No closed form (Carmichael): by quadrature.
		expect(off(area, 22.6720577587)).toBeLessThan(3e-5);
	});

	it('open shells tell that they are open', () => {
		const shell = revolve([...between([0, 1], [1, 1], 4), [1, 1]], 12);
		const { closed, boundaryEdges } = surfaceMeasures(shell.positions, shell.triangles);
		expect([closed, boundaryEdges]).toEqual([false, 24]);
		expect(makeSurface(shell.positions, shell.triangles).watertight).toBe(false);
	});
});

describe('volume under lattice moves by hand', () => {
	const unitBox = (more: Partial<DesignBox> = {}) =>
		makeBox({ centre: [0.5, 0.5, 0.5], halfSize: [0.5, 0.5, 0.5], ...more });
	const change = (k: number, box: DesignBox, lattice: Float64Array) => {
		const { positions, triangles } = cube(k);
		const prepared = prepareMove(makeSurface(positions, triangles), [box], { smoothing: 0 });
		const { volumeBefore, volumeAfter } = prepared.applyByHand([lattice], []);
		expect(volumeBefore).toBeCloseTo(1, 13);
		return volumeAfter - volumeBefore;
	};
	const moved = (box: DesignBox, field: (p: number[]) => number[]) => {
		const points = controlPoints(box);
		const out = new Float64Array(points.length);
		for (let p = 0; p < points.length; p += 3) out.set(field(Array.from(points.subarray(p, p + 3))), p);
		return out;
	};

	// det(I + d grad B') = 1 + d . grad B and the integral of a Bernstein polynomial is 1 / (n + 1): so one point moved by
	// (a, b, c) changes the volume of a body that fills its box by exactly these.
	const [a, b, c] = [0.3, -0.2, 0.15];
	const degrees: [[number, number, number], [number, number, number], number][] = [
		[[1, 1, 1], [1, 1, 1], (a + b + c) / 4],
		[[2, 2, 2], [2, 2, 2], (a + b + c) / 9],
		[[2, 2, 2], [2, 2, 1], (a + b) / 9],
		[[2, 2, 2], [2, 1, 1], a / 9],
		[[2, 2, 2], [1, 1, 1], 0],
		[[3, 2, 4], [3, 2, 4], a / 15 + b / 20 + c / 12]
	];
	it.each(degrees)('degree %j, point %j by (0.3, -0.2, 0.15): %f', (degree, point, wanted) => {
		const lattice = degree.map((n) => n + 1) as [number, number, number];
		const box = unitBox({ lattice });
		const displacement = new Float64Array(3 * lattice[0] * lattice[1] * lattice[2]);
		displacement.set([a, b, c], 3 * pointIndex(lattice, ...point));
		// Flat triangles of the edge h differ by some h^2: extrapolated from two meshes (Richardson).
		const [coarse, fine] = [8, 16].map((k) => change(k, box, displacement));
		expect((4 * fine - coarse) / 3).toBeCloseTo(wanted, 5);
		expect(Math.abs(fine - wanted)).toBeLessThan(1e-3);
	});

	it.each(['bernstein', 'bspline'] as const)('an affine lattice (%s) multiplies it by the determinant', (basis) => {
		const m = [
			[1.1, 0.2, -0.1],
			[0.05, 0.9, 0.3],
			[-0.2, 0.1, 1.2]
		];
		const determinant =
			m[0][0] * (m[1][1] * m[2][2] - m[1][2] * m[2][1]) -
			m[0][1] * (m[1][0] * m[2][2] - m[1][2] * m[2][0]) +
			m[0][2] * (m[1][0] * m[2][1] - m[1][1] * m[2][0]);
		const box = unitBox({ basis, lattice: [5, 4, 6], degree: 3 });
		const lattice = moved(box, (p) => m.map((row, i) => row.reduce((s, x, j) => s + x * p[j], 0) - p[i] + 0.4));
		expect(1 + change(4, box, lattice)).toBeCloseTo(determinant, 12);
	});

	it('a taper of x and y by 1 + z: 1 + 1 + 1/3 = 7/3, a shear of x by y^2: 1', () => {
		const box = unitBox({ lattice: [3, 3, 3] });
		const taper = moved(box, ([x, y, z]) => [x * z, y * z, 0]);
		expect(1 + change(4, box, taper)).toBeCloseTo(7 / 3, 12);
		// y^2 has the Bernstein coefficients 0, 0, 1 in degree 2.
		const shear = moved(box, ([, y]) => [y === 1 ? 1 : 0, 0, 0]);
		expect(1 + change(6, box, shear)).toBeCloseTo(1, 12);
	});
});
