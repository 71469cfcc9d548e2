import { describe, expect, it } from 'vitest';
import { MorphError, prepareKeepOut, type KeepOutGeometry } from '$lib/morph';
import { cube, icosphere, turn } from './shapes';

const box = (more: object = {}): KeepOutGeometry => ({
	kind: 'box',
	centre: [0, 0, 0],
	halfSize: [1, 2, 3],
	rotation: [0, 0, 0, 1],
	...more
});
const at = (geometry: KeepOutGeometry, point: number[], side: 'outside' | 'inside' = 'outside', limit = Infinity) => {
	const d = new Float64Array(1);
	const g = new Float64Array(3);
	prepareKeepOut(geometry, side, 0).distance(Float64Array.from(point), 1, limit, d, g);
	return { d: d[0], g: [...g] };
};
const code = (work: () => unknown) => {
	try {
		work();
	} catch (error) {
		return error instanceof MorphError ? error.code : error;
	}
	return 'nothing thrown';
};

describe('keep-outs in closed form', () => {
	it('half-space: positive on the side that the normal points to', () => {
		const geometry: KeepOutGeometry = { kind: 'halfSpace', point: [1, 0, 0], normal: [0.6, 0.8, 0] };
		const { d, g } = at(geometry, [2, 1, 7]);
		expect(d).toBeCloseTo(1.4, 14);
		expect(g).toEqual([0.6, 0.8, 0]);
		expect(at(geometry, [2, 1, 7], 'inside').d).toBeCloseTo(-1.4, 14);
	});

	it('box: face, edge and corner regions, and the nearest face from inside', () => {
		expect(at(box(), [3, 0.5, -1])).toEqual({ d: 2, g: [1, 0, 0] });
		const edge = at(box(), [-4, 6, 1]);
		expect(edge.d).toBeCloseTo(5, 14);
		expect(edge.g[0]).toBeCloseTo(-0.6, 14);
		expect(edge.g[1]).toBeCloseTo(0.8, 14);
		const corner = at(box(), [2, 4, 5]);
		expect(corner.d).toBeCloseTo(3, 14);
		[1 / 3, 2 / 3, 2 / 3].forEach((x, k) => expect(corner.g[k]).toBeCloseTo(x, 14));
		expect(at(box(), [0.5, -1.75, 0])).toEqual({ d: -0.25, g: [0, -1, 0] });
	});

	it('a turned box is the box at rest seen from its own axes', () => {
		const angle = 0.7;
		const rotation = turn([0, 0, 1], angle);
		const centre = [0.3, -0.2, 0.1];
		const local = [2, 4, 5];
		const world = [
			centre[0] + Math.cos(angle) * local[0] - Math.sin(angle) * local[1],
			centre[1] + Math.sin(angle) * local[0] + Math.cos(angle) * local[1],
			centre[2] + local[2]
		];
		const { d, g } = at(box({ centre, rotation }), world);
		expect(d).toBeCloseTo(3, 13);
		expect(g[0]).toBeCloseTo((Math.cos(angle) - 2 * Math.sin(angle)) / 3, 13);
		expect(g[2]).toBeCloseTo(2 / 3, 13);
	});

	it('gives the limit and no direction beyond it', () => {
		expect(at(box(), [3, 0, 0], 'outside', 0.5)).toEqual({ d: 0.5, g: [0, 0, 0] });
		expect(at(box(), [0, 0, 0], 'inside', 0.5)).toEqual({ d: 0.5, g: [0, 0, 0] });
		expect(at({ kind: 'mesh', ...icosphere(3) }, [0, 0, 4], 'outside', 0.5)).toEqual({ d: 0.5, g: [0, 0, 0] });
	});
});

describe('keep-out meshes', () => {
	it('a cube as a mesh is the box in closed form, in all its regions and on both sides', () => {
		const mesh = cube(3);
		const geometry: KeepOutGeometry = { kind: 'mesh', ...mesh };
		const same = box({ centre: [0.5, 0.5, 0.5], halfSize: [0.5, 0.5, 0.5] });
		const points: number[] = [];
		for (let i = 0; i < 9; i++)
			for (let j = 0; j < 9; j++)
				for (let k = 0; k < 9; k++) points.push(-0.43 + 0.23 * i, -0.51 + 0.24 * j, -0.4 + 0.21 * k);
		const n = points.length / 3;
		for (const side of ['outside', 'inside'] as const) {
			const [d, e] = [new Float64Array(n), new Float64Array(n)];
			const [g, h] = [new Float64Array(3 * n), new Float64Array(3 * n)];
			prepareKeepOut(geometry, side, 0).distance(Float64Array.from(points), n, 5, d, g);
			prepareKeepOut(same, side, 0).distance(Float64Array.from(points), n, 5, e, h);
			for (let i = 0; i < n; i++) expect(d[i]).toBeCloseTo(e[i], 12);
			// Where the distance is not on a ridge the directions agree too.
			let compared = 0;
			for (let i = 0; i < n; i++) {
				const p = points.slice(3 * i, 3 * i + 3).map((x) => 0.5 - Math.abs(x - 0.5));
				const sorted = p.slice().sort((a, b) => a - b);
				if (sorted[0] > 0 && sorted[1] - sorted[0] < 1e-9) continue;
				compared++;
				for (let k = 0; k < 3; k++) expect(g[3 * i + k]).toBeCloseTo(h[3 * i + k], 9);
			}
			expect(compared).toBeGreaterThan(600);
		}
	});

	it('on the surface itself the direction is the pseudonormal', () => {
		const { d, g } = at({ kind: 'mesh', ...cube(1) }, [1, 1, 0.5]);
		expect(d).toBe(0);
		expect(g[0]).toBeCloseTo(Math.SQRT1_2, 12);
		expect(g[1]).toBeCloseTo(Math.SQRT1_2, 12);
	});

	it('the sign is right at the spikes where a face normal errs', () => {
		// A needle: the nearest vertex's faces look in all directions; seen from beside the tip each face normal may say "inside".
		const geometry: KeepOutGeometry = {
			kind: 'mesh',
			positions: Float64Array.of(0, 0, 10, 0.1, 0, 0, -0.05, 0.0866, 0, -0.05, -0.0866, 0),
			triangles: Uint32Array.of(0, 1, 2, 0, 2, 3, 0, 3, 1, 1, 3, 2)
		};
		for (const p of [
			[1, 0.3, 10.2],
			[-1, 0.2, 10.4],
			[0.2, -1, 10.3],
			[0.4, 0.4, -1],
			[0, 0, 10.01]
		])
			expect(at(geometry, p).d).toBeGreaterThan(0);
		expect(at(geometry, [0, 0, 1]).d).toBeLessThan(0);
	});
});

describe('rows at vertices', () => {
	it('are the vertices nearer than clearance and margin, with their slack', () => {
		const keepOut = prepareKeepOut({ kind: 'halfSpace', point: [0, 0, 1], normal: [0, 0, -1] }, 'outside', 0.1);
		const positions = Float64Array.of(0, 0, 0, 0, 0, 0.85, 0, 0, 0.95, 0, 0, 1.2);
		const rows = keepOut.place(Uint32Array.of(0, 1, 2, 3)).rows(positions, 0.1);
		expect(rows.count).toBe(3);
		expect([...rows.vertices]).toEqual([1, 2, 3]);
		expect([...rows.starts]).toEqual([0, 1, 2, 3]);
		[0.05, -0.05, -0.3].forEach((x, i) => expect(rows.slack[i]).toBeCloseTo(x, 14));
		[0.15, 0.05, -0.2].forEach((x, i) => expect(rows.values[i]).toBeCloseTo(x, 14));
		expect([...rows.vectors.subarray(0, 3)]).toEqual([0, 0, -1]);
	});

	it('the slack changes as its row says, to second order (mesh keep-out)', () => {
		const sphere = icosphere(3);
		const keepOut = prepareKeepOut({ kind: 'mesh', ...sphere }, 'outside', 0.2);
		const positions = Float64Array.of(1.15, 0.21, 0.12, 0.4, -0.9, 0.75, -0.3, 0.95, -0.62);
		const delta = Float64Array.of(0.3, -0.5, 0.4, -0.2, 0.6, 0.1, 0.5, 0.2, -0.7);
		const constraint = keepOut.place(Uint32Array.of(0, 1, 2));
		const before = constraint.rows(positions, 10);
		const error = (h: number) => {
			const after = constraint.rows(
				positions.map((x, i) => x + h * delta[i]),
				10
			);
			let worst = 0;
			for (let i = 0; i < 3; i++) {
				let first = 0;
				for (let k = 0; k < 3; k++) first += before.vectors[3 * i + k] * delta[3 * before.vertices[i] + k];
				worst = Math.max(worst, Math.abs(after.slack[i] - before.slack[i] - h * first));
			}
			return worst;
		};
		expect(before.count).toBe(3);
		expect(error(1e-2) / error(5e-3)).toBeGreaterThan(3);
	});
});

describe('keep-outs that make no sense are refused', () => {
	it.each([
		[{ kind: 'halfSpace', point: [0, 0, 0], normal: [0, 0, 2] }, 'keep-out-invalid'],
		[{ kind: 'halfSpace', point: [0, NaN, 0], normal: [0, 0, 1] }, 'keep-out-invalid'],
		[box({ halfSize: [1, 0, 1] }), 'keep-out-invalid'],
		[box({ rotation: [0, 0, 0, 2] }), 'keep-out-invalid'],
		[{ kind: 'cone' }, 'keep-out-invalid'],
		[{ kind: 'mesh', positions: new Float64Array(0), triangles: new Uint32Array(0) }, 'keep-out-invalid'],
		[{ kind: 'mesh', positions: cube(1).positions, triangles: cube(1).triangles.subarray(3) }, 'keep-out-open'],
		[
			{ kind: 'mesh', positions: cube(1).positions, triangles: cube(1).triangles.slice().reverse() },
			'keep-out-invalid'
		],
		[{ kind: 'mesh', positions: cube(1).positions.fill(NaN, 3, 4), triangles: cube(1).triangles }, 'mesh-non-finite']
	])('%#', (geometry, expected) => {
		expect(code(() => prepareKeepOut(geometry as KeepOutGeometry, 'outside', 0))).toBe(expected);
	});

	it('two triangles turned against each other', () => {
		const { positions, triangles } = cube(1);
		const turned = triangles.slice();
		[turned[0], turned[1]] = [turned[1], turned[0]];
		expect(code(() => prepareKeepOut({ kind: 'mesh', positions, triangles: turned }, 'outside', 0))).toBe(
			'keep-out-invalid'
		);
	});

	it('a clearance or a side that is none', () => {
		expect(code(() => prepareKeepOut(box(), 'outside', -1))).toBe('keep-out-invalid');
		expect(code(() => prepareKeepOut(box(), 'between' as 'inside', 0))).toBe('keep-out-invalid');
	});
});
