import { describe, expect, it } from 'vitest';
import { selfIntersections, TriangleTree } from '$lib/morph';
import { cube, icosphere } from './shapes';

type Mesh = { positions: Float64Array; triangles: Uint32Array };

const joined = (a: Mesh, b: Mesh): Mesh => ({
	positions: Float64Array.from([...a.positions, ...b.positions]),
	triangles: Uint32Array.from([...a.triangles, ...b.triangles.map((v) => v + a.positions.length / 3)])
});
const shifted = ({ positions, triangles }: Mesh, by: number[]): Mesh => ({
	positions: positions.map((x, i) => x + by[i % 3]),
	triangles
});
/** Two triangles from six points. */
const two = (...points: number[][]) =>
	selfIntersections(Float64Array.from(points.flat()), Uint32Array.of(0, 1, 2, 3, 4, 5));

describe('selfIntersections', () => {
	it('a pair that crosses, and pairs that touch, miss, or lie in one plane', () => {
		const flat = [
			[0, 0, 0],
			[1, 0, 0],
			[0, 1, 0]
		];
		expect(two(...flat, [0.2, 0.2, -1], [0.3, 0.2, 1], [0.2, 0.3, 1]).count).toBe(1);
		expect(two(...flat, [0.2, 0.2, 0], [0.3, 0.2, 1], [0.2, 0.3, 1]).count).toBe(0);
		expect(two(...flat, [2, 2, -1], [2.1, 2, 1], [2, 2.1, 1]).count).toBe(0);
		expect(two(...flat, [0.1, 0.1, 0], [0.9, 0.2, 0], [0.2, 0.9, 0]).count).toBe(0);
	});

	it('neighbours: a common edge never counts, a common vertex only when the other edges cross', () => {
		const fan = (...rest: number[][]) =>
			selfIntersections(
				Float64Array.from([[0, 0, 0], [1, 0, 0], [0, 1, 0], ...rest].flat()),
				Uint32Array.of(0, 1, 2, 0, 3, 4)
			).count;
		expect(fan([-1, 0, 0.5], [0, -1, 0.5])).toBe(0);
		expect(fan([0.4, 0.4, 1], [0.4, 0.4, -1])).toBe(1);
		const folded = selfIntersections(
			Float64Array.of(0, 0, 0, 1, 0, 0, 0, 1, 0, 0.2, 0.9, 0.01),
			Uint32Array.of(0, 1, 2, 0, 3, 1)
		);
		expect(folded.count).toBe(0);
	});

	it('two bodies: pairs as found by looking at all of them, whatever the order', () => {
		const a = icosphere(2);
		const b = shifted(icosphere(2), [1.1, 0.13, 0.07]);
		const { positions, triangles } = joined(a, b);
		const found = selfIntersections(positions, triangles, { limit: 10000 });
		const listed = new Set(
			Array.from({ length: found.count }, (_, i) => pair(found.pairs[2 * i], found.pairs[2 * i + 1]))
		);
		expect(listed.size).toBe(found.count);
		const brute = new Set<string>();
		for (let s = 0; s < triangles.length / 3; s++)
			for (let t = s + 1; t < triangles.length / 3; t++)
				if (bruteCross(positions, triangles, s, t)) brute.add(pair(s, t));
		expect(brute.size).toBeGreaterThan(40);
		expect(listed).toEqual(brute);
		expect(found.searched).toBe(1);
	});

	it('chosen triangles only, the list cut at its limit, the count not', () => {
		const one = joined(cube(4), shifted(cube(4), [0.61, 0.63, 0.67]));
		const both = joined(one, shifted(one, [5, 0, 0]));
		const whole = selfIntersections(both.positions, both.triangles, { limit: 3 });
		expect(whole.pairs).toHaveLength(6);
		const half = Uint32Array.from({ length: one.triangles.length / 3 }, (_, t) => t);
		const part = selfIntersections(both.positions, both.triangles, { chosen: half });
		expect(part.count).toBeGreaterThan(0);
		expect(2 * part.count).toBe(whole.count);
		expect(part.hit.subarray(half.length).every((x) => x === 0)).toBe(true);
	});

	it('pairs that crossed before are counted apart', () => {
		const before = joined(joined(cube(3), shifted(cube(3), [0.61, 0.63, 0.67])), shifted(cube(3), [3, 0, 0]));
		const n = 2 * (cube(3).positions.length / 3);
		// The third cube is pushed into the second.
		const after = before.positions.map((x, i) => (i >= 3 * n ? x - (i % 3 === 0 ? 1.83 : -0.29) : x));
		const old = selfIntersections(before.positions, before.triangles);
		const found = selfIntersections(after, before.triangles, { before: before.positions });
		expect(old.count).toBeGreaterThan(0);
		expect(found.known).toBe(old.count);
		expect(found.count).toBeGreaterThan(0);
		expect(selfIntersections(after, before.triangles).count).toBe(found.count + found.known);
	});

	it('a tree made at other positions gives the same', () => {
		const { positions, triangles } = joined(icosphere(2), shifted(icosphere(2), [1.1, 0.13, 0.07]));
		const apart = positions.map((x, i) => (i >= positions.length / 2 && i % 3 === 0 ? x + 2 : x));
		const tree = new TriangleTree(apart, triangles);
		expect(selfIntersections(apart, triangles, { tree }).count).toBe(0);
		expect(selfIntersections(positions, triangles, { tree }).count).toBe(selfIntersections(positions, triangles).count);
	});

	it('stops when asked to and says how far it came', () => {
		const { positions, triangles } = icosphere(6);
		let asked = 0;
		const found = selfIntersections(positions, triangles, { stop: () => ++asked > 20 });
		expect(found.searched).toBeGreaterThanOrEqual(0);
		expect(found.searched).toBeLessThan(1);
	});

	it('an unwelded mesh is judged as a welded one', () => {
		const { positions, triangles } = icosphere(3);
		const soup = Float64Array.from([...triangles].flatMap((v) => [...positions.subarray(3 * v, 3 * v + 3)]));
		expect(
			selfIntersections(
				soup,
				Uint32Array.from(triangles, (_, i) => i)
			).count
		).toBe(0);
	});
});

const pair = (s: number, t: number) => `${Math.min(s, t)} ${Math.max(s, t)}`;

/** Plain: the point where each edge meets the other's plane, and whether it lies inside by the areas' signs. */
function bruteCross(p: Float64Array, triangles: Uint32Array, s: number, t: number): boolean {
	const corners = (f: number) =>
		[0, 1, 2].map((k) => [...p.subarray(3 * triangles[3 * f + k], 3 * triangles[3 * f + k] + 3)]);
	const through = (edge: number[][], face: number[][]) => {
		const n = cross(minus(face[1], face[0]), minus(face[2], face[0]));
		const [a, b] = edge.map((x) => dot(minus(x, face[0]), n));
		if (!(a * b < 0)) return false;
		const at = edge[0].map((x, k) => x + ((edge[1][k] - x) * a) / (a - b));
		return [0, 1, 2].every((k) => dot(cross(minus(face[(k + 1) % 3], face[k]), minus(at, face[k])), n) > 0);
	};
	const [f, g] = [corners(s), corners(t)];
	if (f.some((a) => g.some((b) => a.join() === b.join()))) return false;
	return [0, 1, 2].some((k) => through([f[k], f[(k + 1) % 3]], g) || through([g[k], g[(k + 1) % 3]], f));
}
const dot = (a: number[], b: number[]) => a[0] * b[0] + a[1] * b[1] + a[2] * b[2];
const minus = (a: number[], b: number[]) => a.map((x, k) => x - b[k]);
const cross = (a: number[], b: number[]) =>
	[0, 1, 2].map((k) => a[(k + 1) % 3] * b[(k + 2) % 3] - a[(k + 2) % 3] * b[(k + 1) % 3]);
