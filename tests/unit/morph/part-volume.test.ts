import { describe, expect, it } from 'vitest';
import { patchVolume, volumeOf, type MorphError } from '$lib/morph';
import { cube, icosphere, revolution } from './shapes';

type Mesh = { positions: Float64Array; triangles: Uint32Array };
const where = ({ positions, triangles }: Mesh, test: (x: number, y: number, z: number) => boolean) =>
	Uint32Array.from({ length: triangles.length / 3 }, (_, t) => t).filter((t) => {
		const m = [0, 1, 2].map((d) => [0, 1, 2].reduce((sum, k) => sum + positions[3 * triangles[3 * t + k] + d] / 3, 0));
		return test(m[0], m[1], m[2]);
	});
const refusal = (work: () => unknown) => {
	try {
		work();
	} catch (error) {
		return [(error as MorphError).code, (error as MorphError).message];
	}
	return ['nothing thrown', ''];
};

describe('patchVolume', () => {
	it('a whole body needs no cap and has its own volume', () => {
		const mesh = icosphere(3);
		const part = patchVolume(
			mesh.positions,
			mesh.triangles,
			where(mesh, () => true)
		);
		expect(part.caps).toBe(0);
		expect(part.volume).toBeCloseTo(volumeOf(mesh.positions, mesh.triangles), 14);
		expect(part.triangles).toEqual(mesh.triangles);
	});

	it('half a cube, cut in a plane, wherever the cube stands', () => {
		const mesh = cube(4);
		const positions = mesh.positions.map((x, i) => x + [100, -20, 3][i % 3]);
		const part = patchVolume(
			positions,
			mesh.triangles,
			where(mesh, (x) => x < 0.5)
		);
		expect(part.caps).toBe(1);
		expect(part.volume).toBeCloseTo(0.5, 10);
		expect(part.positions.length).toBe(positions.length + 3);
		[100.5, -19.5, 3.5].forEach((x, d) => expect(part.positions[positions.length + d]).toBeCloseTo(x, 12));
	});

	it('the side wall alone is closed at both ends', () => {
		const mesh = cube(4);
		const part = patchVolume(
			mesh.positions,
			mesh.triangles,
			where(mesh, (x) => x > 1e-9 && x < 1 - 1e-9)
		);
		expect(part.caps).toBe(2);
		expect(part.volume).toBeCloseTo(1, 14);
	});

	// Frustum R 5, r 2, h 4: 52 pi (textbook: h (R^2 + R r + r^2) pi / 3), with the polygon's share of the circle.
	it('a frustum from its mantle', () => {
		const sectors = 720;
		// Rings 1 to 5 of six carry the mantle; the tips lie in its end planes.
		const mesh = revolution(6, sectors, (s) => {
			const along = (6 * s - 1) / 4;
			return s === 0 ? [0, 0] : s === 1 ? [4, 0] : [4 * along, 5 - 3 * along];
		});
		const tips = [0, mesh.positions.length / 3 - 1];
		const mantle = Uint32Array.from({ length: mesh.triangles.length / 3 }, (_, t) => t).filter(
			(t) => ![0, 1, 2].some((k) => tips.includes(mesh.triangles[3 * t + k]))
		);
		const part = patchVolume(mesh.positions, mesh.triangles, mantle);
		const polygon = Math.sin((2 * Math.PI) / sectors) / ((2 * Math.PI) / sectors);
		expect(part.caps).toBe(2);
		expect(Math.abs(part.volume / (52 * Math.PI * polygon) - 1)).toBeLessThan(1e-12);
	});

	it('the gradient passes the Taylor test with slope 2, the cap points held', () => {
		const mesh = icosphere(3);
		const part = patchVolume(
			mesh.positions,
			mesh.triangles,
			where(mesh, (x, y) => x + 0.3 * y > 0.2)
		);
		const move = mesh.positions.map((x, i) => Math.sin(7 * x + i) + 0.3 * Math.cos(3 * i));
		const error = (h: number) => {
			const moved = part.positions.slice();
			move.forEach((m, i) => (moved[i] += h * m));
			const first = part.gradient.reduce((sum, g, i) => sum + g * move[i], 0);
			return Math.abs(volumeOf(moved, part.triangles) - part.volume - h * first);
		};
		for (const h of [1e-2, 5e-3, 2.5e-3]) expect(Math.log2(error(h) / error(h / 2))).toBeCloseTo(2, 1);
		// The body's other vertices do not matter, and there are some of both.
		const zero = part.gradient.filter((g) => g === 0).length;
		expect(zero).toBeGreaterThan(100);
		expect(zero).toBeLessThan(part.gradient.length - 100);
	});

	it('refuses what has no clear boundary', () => {
		const { positions, triangles } = cube(2);
		const at = (...ids: number[]) => refusal(() => patchVolume(positions, triangles, Uint32Array.from(ids)));
		expect(at()[0]).toBe('part-invalid');
		expect(at(9999)[1]).toContain('9999');
		expect(at(3, 3)[1]).toContain('twice');
		// Two triangles of a face that meet in a point only.
		const share = (s: number, t: number) =>
			[0, 1, 2].filter((k) => [0, 1, 2].some((l) => triangles[3 * s + k] === triangles[3 * t + l])).length;
		const t = Array.from({ length: triangles.length / 3 }, (_, i) => i).find(
			(i) => i > 0 && share(0, i) === 1
		) as number;
		expect(at(0, t)).toEqual(['part-invalid', expect.stringContaining('meets itself at vertex')]);
		// A third triangle on an edge; a neighbour turned round.
		const third = Uint32Array.of(0, 1, 2, 1, 0, 3, 0, 1, 4);
		const five = Float64Array.of(0, 0, 0, 1, 0, 0, 0, 1, 0, 0, 0, 1, 0, -1, -1);
		expect(refusal(() => patchVolume(five, third, Uint32Array.of(0, 1, 2)))[1]).toContain('more than two');
		const against = Uint32Array.of(0, 1, 2, 0, 1, 3);
		expect(refusal(() => patchVolume(five, against, Uint32Array.of(0, 1)))[1]).toContain('against');
	});
});
