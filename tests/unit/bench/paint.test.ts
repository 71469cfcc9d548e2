import { describe, expect, test } from 'vitest';
import { SurfaceReach } from '$lib/workers/paint-kernels';
import { DisplayModel } from '$lib/workers/display-model';
import type { Vec3 } from '$lib/workers/display-protocol';
import { ellipsoid } from '../../factories/surfaces';

/** A box of 12 triangles, two a side, outward; triangles 2 s and 2 s + 1 are those of one side. */
function slab([x, y, z]: Vec3) {
	const corners = [0, 1, 2, 3, 4, 5, 6, 7].map((i) => [i & 1 ? x : 0, i & 2 ? y : 0, i & 4 ? z : 0]);
	const sides = [
		[0, 2, 3, 1],
		[4, 5, 7, 6],
		[0, 1, 5, 4],
		[2, 6, 7, 3],
		[0, 4, 6, 2],
		[1, 3, 7, 5]
	];
	const triangles = sides.flatMap(([a, b, c, d]) => [a, b, c, a, c, d]);
	return { positions: Float64Array.from(corners.flat()), triangles: Uint32Array.from(triangles) };
}

function body() {
	const mesh = ellipsoid(4, [1.2, 0.45, 0.35]);
	return { positions: Float64Array.from(mesh.positions), triangles: Uint32Array.from(mesh.triangles) };
}

const middleOf = (p: Float64Array, triangles: Uint32Array, t: number): Vec3 =>
	[0, 1, 2].map((k) => [0, 1, 2].reduce((sum, c) => sum + p[3 * triangles[3 * t + c] + k] / 3, 0)) as Vec3;

describe('what painting reaches', () => {
	test('a fill stays on its side of a cube below a right angle, and goes all round from there on', () => {
		const { positions, triangles } = slab([1, 1, 1]);
		const reach = new SurfaceReach(positions, triangles);
		for (let side = 0; side < 6; side++) {
			expect([...reach.fill(2 * side, (89 * Math.PI) / 180)]).toEqual([2 * side, 2 * side + 1]);
			expect([...reach.fill(2 * side + 1, 0)]).toEqual([2 * side, 2 * side + 1]);
		}
		expect(reach.fill(0, Math.PI / 2)).toHaveLength(12);
	});

	test('a brush reaches what brute force finds near the point, where that hangs together', () => {
		const { positions, triangles } = body();
		const reach = new SurfaceReach(positions, triangles);
		const t = 417;
		const point = middleOf(positions, triangles, t);
		const near: number[] = [];
		for (let s = 0; 3 * s < triangles.length; s++) {
			const middle = middleOf(positions, triangles, s);
			if (Math.hypot(...middle.map((x, k) => x - point[k])) <= 0.2) near.push(s);
		}
		expect(near.length).toBeGreaterThan(20);
		expect([...reach.brush(t, point, 0.2)]).toEqual(near);
	});

	test('a brush wider than a wall does not paint its other side', () => {
		const { positions, triangles } = slab([10, 10, 0.01]);
		const reach = new SurfaceReach(positions, triangles);
		const upper = 2;
		const point = middleOf(positions, triangles, upper);
		const lower = middleOf(positions, triangles, 1);
		expect(Math.hypot(...lower.map((x, k) => x - point[k]))).toBeLessThan(2);
		expect([...reach.brush(upper, point, 2)]).not.toContain(1);
		expect([...reach.brush(upper, point, 0)]).toEqual([upper]);
	});

	test('a box takes the triangles that lie whole in it', () => {
		const { positions, triangles } = body();
		const within = (v: number) =>
			positions[3 * v] >= 0.2 && positions[3 * v] <= 1 && Math.abs(positions[3 * v + 1]) <= 0.3;
		const wanted = Array.from({ length: triangles.length / 3 }, (_, t) => t).filter((t) =>
			[0, 1, 2].every((c) => within(triangles[3 * t + c]))
		);
		const found = new SurfaceReach(positions, triangles).inBox({
			id: 'b',
			centre: [0.6, 0, 0],
			halfSize: [0.4, 0.3, 2],
			rotation: [0, 0, 0, 1],
			lattice: [2, 2, 2],
			basis: 'bernstein',
			held: { u0: 0, u1: 0, v0: 0, v1: 0, w0: 0, w1: 0 },
			axes: ['x', 'y', 'z'],
			frame: 'box'
		});
		expect(wanted.length).toBeGreaterThan(50);
		expect([...found]).toEqual(wanted);
	});
});

describe('painting in the display model', () => {
	const MM = 0.001;
	function loaded() {
		const mesh = ellipsoid(4, [1200, 450, 350]);
		const model = new DisplayModel();
		model.calls.load({
			positions: Float32Array.from(mesh.positions).buffer,
			triangles: Uint32Array.from(mesh.triangles).buffer,
			metresPerUnit: MM
		});
		return { model, triangles: mesh.triangles };
	}
	const down = (x: number) => ({ origin: [x, 0, 3] as Vec3, direction: [0, 0, -1] as Vec3 });

	test('a stroke paints along its lines of sight, and beside the surface nothing', () => {
		const { model } = loaded();
		const one = model.calls.reach({ kind: 'brush', sights: [down(0)], on: 'rest', radius: 0.05 });
		const three = model.calls.reach({
			kind: 'brush',
			sights: [down(0), down(0.1), down(0.2)],
			on: 'rest',
			radius: 0.05
		});
		expect(one.length).toBeGreaterThan(0);
		expect(three.length).toBeGreaterThan(one.length);
		expect([...three]).toEqual([...three].sort((a, b) => a - b));
		for (const t of one) expect(three).toContain(t);
		expect(model.calls.reach({ kind: 'brush', sights: [down(2)], on: 'rest', radius: 0.05 })).toHaveLength(0);
	});

	test('what a lock spares is everything on it and falls to nothing over the blend distance', () => {
		const { model, triangles } = loaded();
		const locked = model.calls.reach({ kind: 'brush', sights: [down(0)], on: 'rest', radius: 0.1 });
		const spared = model.calls.spared({ locks: [{ triangles: locked.slice(), blend: 0.15 }] });
		for (const t of locked) for (let k = 0; k < 3; k++) expect(spared[triangles[3 * t + k]]).toBe(1);
		expect(Math.min(...spared)).toBe(0);
		expect([...spared].filter((s) => s > 0.05 && s < 0.95).length).toBeGreaterThan(10);
	});
});
