import { describe, expect, it } from 'vitest';
import { checkMove, makeSurface, prepareKeepOut, prepareThickness, TriangleTree, USUAL_AREA_RATIO } from '$lib/morph';
import { cube, gridSurface, icosphere, revolution } from './shapes';

const ids = (n: number) => Uint32Array.from({ length: n }, (_, v) => v);
const movedOf = (before: Float64Array, after: Float64Array) =>
	ids(before.length / 3).filter((v) => [0, 1, 2].some((d) => before[3 * v + d] !== after[3 * v + d]));

describe('checkMove: what is asked for beside flipped triangles and angles', () => {
	it('gives no further check when none is asked for', () => {
		const { positions, triangles } = icosphere(2);
		expect(Object.keys(checkMove({ before: positions, after: positions, triangles }))).toEqual(['flipped', 'minAngle']);
	});

	it('area ratio: the triangle strained most, on its own side of the limits', () => {
		const { positions, triangles } = cube(4);
		const grown = positions.map((x, i) => (i % 3 === 0 ? 5 * x : x));
		const big = checkMove({ before: positions, after: grown, triangles, areaRatio: USUAL_AREA_RATIO }).areaRatio!;
		expect(big.value).toBeCloseTo(5, 12);
		expect(big).toMatchObject({ limit: 4, ok: false, hard: false, count: 4 * 32 });
		const shrunk = positions.map((x, i) => (i % 3 === 0 ? 0.5 * x : x));
		const small = checkMove({ before: positions, after: shrunk, triangles, areaRatio: USUAL_AREA_RATIO }).areaRatio!;
		expect(small.value).toBeCloseTo(0.5, 12);
		expect(small).toMatchObject({ limit: 0.25, ok: true, count: 0 });
	});

	it('self-intersection: hard, new pairs only, what the parent has is said', () => {
		const a = cube(4);
		const half = a.positions.length;
		const triangles = Uint32Array.from([...a.triangles, ...a.triangles.map((v) => v + half / 3)]);
		const apart = Float64Array.from([...a.positions, ...a.positions.map((x, i) => x + [1.5, 0.13, 0.17][i % 3])]);
		const pushed = apart.map((x, i) => (i >= half && i % 3 === 0 ? x - 0.63 : x));
		const deeper = pushed.map((x, i) => (i >= half && i % 3 === 0 ? x - 0.01 : x));
		const tree = new TriangleTree(apart, triangles);
		const check = (before: Float64Array, after: Float64Array) =>
			checkMove({ before, after, triangles, moved: movedOf(before, after), selfIntersection: { tree } })
				.selfIntersection!;
		expect(
			check(
				apart,
				apart.map((x, i) => (i < half ? x : x + 0.1))
			)
		).toMatchObject({ value: 0, ok: true, before: 0 });
		const crossed = check(apart, pushed);
		expect(crossed.value).toBeGreaterThan(0);
		expect(crossed).toMatchObject({ limit: 0, ok: false, hard: true, before: 0, count: crossed.value });
		expect(crossed.place!.position[0]).toBeGreaterThan(0.5);
		const again = check(pushed, deeper);
		expect(again).toMatchObject({ value: 0, ok: true, before: crossed.value });
	});

	it('thickness: hard, and a place that was thin before only when it gets thinner', () => {
		const { positions, triangles } = cube(6);
		const before = positions.map((x, i) => (i % 3 === 2 ? 0.1 * x : x));
		const surface = makeSurface(before, triangles);
		const dent = (depth: number) =>
			before.map((x, i) => {
				const v = 3 * Math.floor(i / 3);
				const top = i % 3 === 2 && before[v + 2] > 0.05;
				const inner = Math.hypot(before[v] - 0.5, before[v + 1] - 0.5) < 0.25;
				return top && inner ? x - depth : x;
			});
		const check = (least: number, depth: number) => {
			const after = dent(depth);
			const prepared = prepareThickness(surface, least);
			return checkMove({ before, after, triangles, moved: movedOf(before, after), thickness: [{ prepared }] })
				.thickness!;
		};
		expect(check(0.05, 0.03)).toMatchObject({ limit: 0.05, ok: true, hard: true, count: 0 });
		expect(check(0.05, 0.03).value).toBeCloseTo(0.07, 2);
		const broken = check(0.05, 0.06);
		expect(broken.ok).toBe(false);
		expect(broken.value).toBeLessThan(0.045);
		expect(broken.count).toBeGreaterThan(3);
		expect(check(0.2, 0.01).ok).toBe(false);
		expect(check(0.2, -0.01).ok).toBe(true);
	});

	it('keep-outs: the clearance at vertices, in the unit of metres whatever that of the positions', () => {
		const { positions, triangles } = icosphere(3);
		const prepared = prepareKeepOut({ kind: 'halfSpace', point: [1.1, 0, 0], normal: [-1, 0, 0] }, 'outside', 0.05);
		const check = (shift: number, unit: number) => {
			const after = positions.map((x, i) => (x + (i % 3 === 0 ? shift : 0)) / unit);
			return checkMove({
				before: positions.map((x) => x / unit),
				after,
				triangles,
				metresPerUnit: unit,
				keepOuts: [{ label: 'wall', prepared }]
			}).keepOut!;
		};
		for (const unit of [1, 0.001]) {
			const front = Math.max(...positions.filter((_, i) => i % 3 === 0));
			expect(check(0, unit)).toMatchObject({ limit: 0.05, ok: true, hard: true, count: 0, label: 'wall' });
			expect(check(0, unit).value).toBeCloseTo(1.1 - front, 9);
			const broken = check(0.07, unit);
			expect(broken.value).toBeCloseTo(1.03 - front, 9);
			expect(broken.ok).toBe(false);
			expect(broken.place!.position[0]).toBeCloseTo(front + 0.07, 9);
		}
	});

	it('keep-outs: a corner that pokes through a triangle between its vertices is found, with its depth', () => {
		// A plate of large triangles, and the corner of a box on its tip below it.
		const { positions, triangles } = cube(1);
		const rotation: [number, number, number, number] = [0, Math.sin(Math.PI / 8), 0, Math.cos(Math.PI / 8)];
		const reach = Math.SQRT1_2 * 0.4;
		const box = (top: number) =>
			prepareKeepOut(
				{ kind: 'box', centre: [0.3, 0.6, -reach + top], halfSize: [0.2, 0.1, 0.2], rotation },
				'outside',
				0
			);
		const check = (top: number, prepared = box(top)) =>
			checkMove({ before: positions, after: positions, triangles, keepOuts: [{ label: 'edge', prepared }] }).keepOut!;
		expect(check(-0.01).ok).toBe(true);
		const cut = check(0.02);
		expect(cut).toMatchObject({ ok: false, hard: true, count: 1, limit: 0 });
		// The nearest face seen from the edge's own depth 0.02: at 45 degrees.
		expect(-cut.value).toBeGreaterThan(0.009);
		expect(-cut.value).toBeLessThan(0.0142);
		expect(cut.place!.position[2]).toBe(0);
		// The same by a mesh.
		const mesh = cube(2);
		const turned = mesh.positions.slice();
		for (let v = 0; v < turned.length; v += 3) {
			const [x, y, z] = [0.4 * (turned[v] - 0.5), 0.2 * (turned[v + 1] - 0.5), 0.4 * (turned[v + 2] - 0.5)];
			turned.set([0.3 + (x + z) * Math.SQRT1_2, 0.6 + y, 0.02 - reach + (z - x) * Math.SQRT1_2], v);
		}
		const same = check(0, prepareKeepOut({ kind: 'mesh', positions: turned, triangles: mesh.triangles }, 'outside', 0));
		expect(same.value).toBeCloseTo(cut.value, 3);
		expect(same.ok).toBe(false);
	});

	it('keep-outs: the sag between vertices that touch a round keep-out is no cut', () => {
		const ball = icosphere(4);
		const prepared = prepareKeepOut({ kind: 'mesh', ...ball }, 'outside', 0);
		// A fine shell lies on the ball: its vertices touch, its triangles cut by their sagitta, about 1e-5.
		const shell = icosphere(6);
		const lifted = prepareKeepOut({ kind: 'mesh', ...ball }, 'outside', 0);
		const d = new Float64Array(shell.positions.length / 3);
		const g = new Float64Array(shell.positions.length);
		lifted.distance(shell.positions, d.length, 1, d, g);
		const on = shell.positions.map((x, i) => x - d[Math.floor(i / 3)] * g[i]);
		const check = checkMove({
			before: on,
			after: on,
			triangles: shell.triangles,
			keepOuts: [{ label: 'ball', prepared }]
		}).keepOut!;
		expect(check.ok).toBe(true);
		expect(Math.abs(check.value)).toBeLessThan(1e-12);
	});

	it('radius: hard with a limit, against the parent’s place by place; else the parent’s smallest is a warning', () => {
		// A torus whose tube is made thinner: 1 / r falls.
		const torus = (r: number) =>
			gridSurface(120, 60, (u, v) => {
				const [a, b] = [2 * Math.PI * u, 2 * Math.PI * v];
				return [(2 + r * Math.cos(b)) * Math.cos(a), (2 + r * Math.cos(b)) * Math.sin(a), r * Math.sin(b)];
			});
		const { positions: before, triangles } = torus(0.5);
		const check = (r: number, limit?: number) =>
			checkMove({ before, after: torus(r).positions, triangles, radius: { limit } }).radius!;
		expect(check(0.45, 0.4)).toMatchObject({ ok: true, hard: true, count: 0, limit: 0.4 });
		expect(check(0.45, 0.4).value).toBeCloseTo(0.45, 2);
		expect(check(0.3, 0.4)).toMatchObject({ ok: false, hard: true, count: before.length / 3 });
		expect(check(0.3, 0.4).before).toBeCloseTo(0.5, 2);
		// Sharper than the limit before, and no sharper now.
		expect(check(0.5, 0.8).ok).toBe(true);
		expect(check(0.5)).toMatchObject({ ok: true, hard: false });
		expect(check(0.4)).toMatchObject({ ok: false, hard: false });
	});

	it('what has no convex ground, no wall and no keep-out near has no such check', () => {
		const bowl = revolution(12, 24, (s) => [-Math.cos(Math.PI * s), Math.sin(Math.PI * s)]);
		const inward = bowl.triangles.slice().reverse();
		const checks = checkMove({ before: bowl.positions, after: bowl.positions, triangles: inward, radius: {} });
		expect(checks.radius).toBeUndefined();
		expect('radius' in checks).toBe(false);
	});
});
