import { describe, expect, test } from 'vitest';
import { makeSurface, nodalGradient, prepareMove, toMetres, type DesignBox } from '$lib/morph';
import { averaged, histogramOf, spreadOf, vertexNormals } from '$lib/workers/display-kernels';
import { DisplayModel } from '$lib/workers/display-model';
import { ellipsoid } from '../../factories/surfaces';

const MM = 0.001;
const box: DesignBox = {
	id: 'b',
	centre: [0.6, 0, 0],
	halfSize: [0.7, 0.6, 0.5],
	rotation: [0, 0, 0, 1],
	lattice: [5, 4, 4],
	basis: 'bernstein',
	held: { u0: 2, u1: 0, v0: 0, v1: 0, w0: 0, w1: 0 },
	axes: ['x', 'y', 'z'],
	frame: 'box'
};

function loaded() {
	const mesh = ellipsoid(4, [1200, 450, 350]);
	const positions = Float32Array.from(mesh.positions);
	const triangles = Uint32Array.from(mesh.triangles);
	const model = new DisplayModel();
	const bytes = () => positions.slice().buffer;
	const shown = model.calls.load({ positions: bytes(), triangles: triangles.slice().buffer, metresPerUnit: MM });
	return { model, positions, triangles, shown, bytes };
}

describe('the display model', () => {
	test('area and normals agree with the engine', () => {
		const { positions, triangles, shown } = loaded();
		const surface = makeSurface(toMetres(positions, MM), triangles);
		expect(shown.area / surface.area).toBeCloseTo(1, 5);
		let worst = 0;
		surface.normals.forEach((n, i) => (worst = Math.max(worst, Math.abs(n - shown.normals[i]))));
		expect(worst).toBeLessThan(1e-4);
	});

	test('a move shown from its lattices is the move that the engine made', () => {
		const { model, positions, triangles } = loaded();
		const surface = makeSurface(toMetres(positions, MM), triangles);
		const n = positions.length / 3;
		const values = Float64Array.from({ length: n }, (_, v) => Math.sin(3 * surface.positions[3 * v]));
		const gradient = nodalGradient({ kind: 'density', location: 'vertex', values, outward: 'raises' }, surface);
		const solution = prepareMove(surface, [box], { smoothing: 0.05 }).solve({
			objectives: [{ id: 'o', gradient, sense: 'minimise', weight: 1 }],
			step: 0.01,
			constraints: [{ kind: 'volume', bound: 'hold' }]
		});
		const moved = model.calls.move({ boxes: [box], lattices: solution.lattices, exaggeration: 1 });
		let worst = 0;
		solution.moved.forEach((v, i) => {
			for (let k = 0; k < 3; k++) {
				const wanted = surface.positions[3 * v + k] + solution.displacement[3 * i + k];
				worst = Math.max(worst, Math.abs(moved.positions[3 * v + k] - wanted));
			}
		});
		expect(worst).toBeLessThan(1e-6);

		// Summed over the surface, the gain density is the change that the engine predicts (to first order, float32).
		expect(() => model.calls.gain({})).toThrow(/needs a map/);
		model.calls.map({ values: Float32Array.from(values).buffer, scale: 0.001 });
		const gain = model.calls.gain({});
		const sum = gain.values.reduce((s, x, v) => s + x * surface.mass[v], 0);
		const predicted = solution.moved.reduce(
			(s, v, i) => s + [0, 1, 2].reduce((p, k) => p + gradient[3 * v + k] * solution.displacement[3 * i + k], 0),
			0
		);
		expect(sum / predicted).toBeCloseTo(1, 4);

		// Drawn larger, the values stay what they are, in mm along the normal.
		const large = model.calls.exaggerate({ exaggeration: 20 });
		expect(large.field.values).toEqual(moved.field.values);
		const v = solution.moved[100];
		const along = [0, 1, 2].reduce((s, k) => s + solution.displacement[300 + k] * surface.normals[3 * v + k], 0);
		expect(moved.field.values[v]).toBeCloseTo(1000 * along, 3);
		expect(large.positions[3 * v] - surface.positions[3 * v]).toBeCloseTo(20 * solution.displacement[300], 5);
	});

	test('a pick finds the point and its value; a share counts the area inside', () => {
		const { model, shown, bytes } = loaded();
		const n = shown.positions.length / 3;
		const height = Float32Array.from({ length: n }, (_, v) => 1000 * shown.positions[3 * v + 2]);
		model.calls.map({ values: height.slice().buffer, scale: 0.001 });
		const pick = model.calls.pick({
			origin: [0.2, 0.1, 5],
			direction: [0, 0, -1],
			on: 'rest',
			fields: ['map', 'move']
		})!;
		expect(pick.point[0]).toBeCloseTo(0.2, 6);
		expect(pick.values[0]).toBeCloseTo(pick.point[2], 5);
		expect(pick.values[1]).toBeNull();
		expect(pick.normal[2]).toBeGreaterThan(0.5);

		const half: DesignBox = { ...box, centre: [1, 0, 0], halfSize: [1, 2, 2] };
		const share = model.calls.share({ box: half, field: 'map' });
		expect(share.area).toBeGreaterThan(0.49);
		expect(share.area).toBeLessThan(0.53);
		expect(model.calls.difference({ positions: bytes(), metresPerUnit: MM }).spread.robust).toBe(0);
	});

	test('what does not fit the surface is refused', () => {
		const { model } = loaded();
		expect(() => model.calls.map({ values: new Float32Array(7).buffer, scale: 1 })).toThrow(/Expected \d+ numbers/);
		expect(() =>
			new DisplayModel().calls.load({
				positions: new Float32Array(9).buffer,
				triangles: new Uint32Array([0, 1, 3]).buffer,
				metresPerUnit: 1
			})
		).toThrow(/name vertex 3/);
	});
});

describe('display kernels', () => {
	test('the robust limit leaves 2 % of the area beyond it', () => {
		const values = Float32Array.from({ length: 1000 }, (_, i) => (i % 2 ? 1 : -1) * (i + 1));
		const spread = spreadOf(values, new Float32Array(1000).fill(1));
		expect(spread).toEqual({ min: -999, max: 1000, robust: 980 });
	});

	test('a histogram’s shares add to one and stand where the values are', () => {
		const shares = histogramOf(Float32Array.of(-0.9, 0.1, 0.9, 5), Float32Array.of(1, 2, 1, 9), 1, 4);
		expect([...shares]).toEqual([0.25, 0, 0.5, 0.25]);
	});

	test('averaging keeps what is even and calms what is not', () => {
		const { positions, triangles } = loaded();
		const n = positions.length / 3;
		const even = averaged(new Float32Array(n).fill(2), triangles, 8);
		expect(Math.max(...even)).toBeCloseTo(2, 5);
		const spike = new Float32Array(n);
		spike[10] = 1;
		expect(Math.max(...averaged(spike, triangles, 16))).toBeLessThan(0.1);
		expect(vertexNormals(positions, triangles).length).toBe(positions.length);
	});
});
