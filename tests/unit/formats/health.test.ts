import { describe, expect, it } from 'vitest';
import { surfaceHealth, type FindingCode } from '$lib/formats/health';
import { dropDegenerate, dropDuplicates, reorient, weld, type RepairMesh } from '$lib/formats/repair';
import { surfaceMeasures } from '$lib/morph';
import { ellipsoid } from '../../factories/surfaces';

type Triple = readonly [number, number, number];

function sphere(level: number, radius = 1, centre: Triple = [0, 0, 0]): RepairMesh {
	const { positions, triangles } = ellipsoid(level, [radius, radius, radius]);
	return {
		positions: Float32Array.from(positions, (x, i) => x + centre[i % 3]),
		triangles: Uint32Array.from(triangles),
		patches: [{ name: 'sphere', firstTriangle: 0, triangleCount: triangles.length / 3 }]
	};
}

function merge(...meshes: RepairMesh[]): RepairMesh {
	let vertex = 0;
	let triangle = 0;
	const positions: number[] = [];
	const triangles: number[] = [];
	const patches = meshes.map((mesh, k) => {
		positions.push(...mesh.positions);
		mesh.triangles.forEach((v) => triangles.push(v + vertex));
		vertex = positions.length / 3;
		const patch = { name: `part ${k}`, firstTriangle: triangle, triangleCount: mesh.triangles.length / 3 };
		triangle += patch.triangleCount;
		return patch;
	});
	return { positions: Float32Array.from(positions), triangles: Uint32Array.from(triangles), patches };
}

function flipped(mesh: RepairMesh, which: (t: number) => boolean = () => true): RepairMesh {
	const triangles = mesh.triangles.slice();
	for (let t = 0; t < triangles.length / 3; t++) {
		if (which(t)) [triangles[3 * t + 1], triangles[3 * t + 2]] = [triangles[3 * t + 2], triangles[3 * t + 1]];
	}
	return { ...mesh, triangles };
}

const found = (mesh: RepairMesh) => {
	const { findings } = surfaceHealth(mesh);
	return Object.fromEntries(findings.map((f) => [f.code, f.count])) as Partial<Record<FindingCode, number>>;
};
const volume = (mesh: RepairMesh) => surfaceMeasures(Float64Array.from(mesh.positions), mesh.triangles).volume;

describe('health', () => {
	it('a sphere is sound', () => {
		const health = surfaceHealth(sphere(3));
		expect(health).toMatchObject({ findings: [], closed: true, openLoops: 0, partCount: 1, intersectionsSearched: 1 });
	});

	it('a hole of one triangle is a loop of three open edges', () => {
		const mesh = sphere(2);
		const open = { ...mesh, triangles: mesh.triangles.slice(3) };
		const health = surfaceHealth(open);
		expect(health).toMatchObject({ closed: false, openLoops: 1 });
		expect(health.findings).toMatchObject([{ code: 'open-edges', count: 3, severity: 'fault' }]);
		expect(new Set(health.findings[0].edges)).toEqual(new Set(mesh.triangles.slice(0, 3)));
	});

	it('one turned triangle has three inconsistent edges; reorient turns it back', () => {
		const mesh = sphere(2);
		const bad = flipped(mesh, (t) => t === 7);
		expect(found(bad)).toEqual({ 'inconsistent-edges': 3 });
		const mended = reorient(bad);
		expect(mended.changed).toBe(1);
		expect(found(mended.mesh)).toEqual({});
		expect(volume(mended.mesh)).toBeCloseTo(volume(mesh), 12);
		// The given mesh is not changed.
		expect(found(bad)).toEqual({ 'inconsistent-edges': 3 });
	});

	it('an inward part is found and turned; the wall of a cavity is left', () => {
		const hollow = merge(sphere(2), flipped(sphere(2, 0.5)));
		expect(found(hollow)).toEqual({ cavities: 1, 'separate-parts': 2 });
		expect(reorient(hollow).changed).toBe(0);
		const beside = merge(sphere(2), flipped(sphere(2, 0.5, [3, 0, 0])));
		expect(found(beside)).toEqual({ 'inward-parts': 1, 'separate-parts': 2 });
		const mended = reorient(beside);
		expect(mended.changed).toBe(320);
		expect(found(mended.mesh)).toEqual({ 'separate-parts': 2 });
		expect(reorient(flipped(sphere(2))).changed).toBe(320);
		// Half of the triangles turned at random still come out outward.
		const mixed = reorient(flipped(sphere(2), (t) => (t * 7919) % 5 < 3));
		expect(volume(mixed.mesh)).toBeCloseTo(volume(sphere(2)), 12);
	});

	it('degenerate, repeated and back-to-back triangles are counted and dropped, patches follow', () => {
		const mesh = sphere(1);
		const [a, b, c] = mesh.triangles;
		const extra = Uint32Array.from([a, a, b, b, c, a, a, c, b]);
		const triangles = new Uint32Array(mesh.triangles.length + 9);
		triangles.set(mesh.triangles);
		triangles.set(extra, mesh.triangles.length);
		const bad: RepairMesh = {
			positions: mesh.positions,
			triangles,
			patches: [
				{ name: 'first', firstTriangle: 0, triangleCount: 80 },
				{ name: 'second', firstTriangle: 80, triangleCount: 3 }
			],
			attributes: Uint16Array.from({ length: 83 }, (_, t) => t)
		};
		const counts = found(bad);
		expect(counts).toMatchObject({ 'degenerate-triangles': 1, 'duplicate-triangles': 1, 'double-sheets': 1 });
		const once = dropDegenerate(bad);
		expect([...once.triangleMap.subarray(79)]).toEqual([79, -1, 80, 81]);
		const twice = dropDuplicates(once.mesh);
		expect([...twice.triangleMap.subarray(79)]).toEqual([79, -1, 80]);
		expect(twice.mesh.patches).toEqual([
			{ name: 'first', firstTriangle: 0, triangleCount: 80 },
			{ name: 'second', firstTriangle: 80, triangleCount: 1 }
		]);
		expect([...twice.mesh.attributes!.subarray(79)]).toEqual([79, 82]);
		expect([...twice.mesh.triangles.subarray(240)]).toEqual([a, c, b]);
	});

	it('an edge of three triangles is not manifold', () => {
		const mesh: RepairMesh = {
			positions: Float32Array.from([0, 0, 0, 1, 0, 0, 0, 1, 0, 0, -1, 0, 0, 0, 1]),
			triangles: Uint32Array.from([0, 1, 2, 1, 0, 3, 0, 1, 4]),
			patches: []
		};
		const health = surfaceHealth(mesh);
		expect(health.findings.find((f) => f.code === 'non-manifold-edges')).toMatchObject({ count: 1, edges: [0, 1] });
		expect(health.partCount).toBe(1);
	});

	it('a soup is open at every edge until it is welded', () => {
		const mesh = sphere(1);
		const soup: RepairMesh = {
			positions: Float32Array.from([...mesh.triangles].flatMap((v) => [...mesh.positions.subarray(3 * v, 3 * v + 3)])),
			triangles: Uint32Array.from({ length: mesh.triangles.length }, (_, i) => i),
			patches: mesh.patches
		};
		const health = surfaceHealth(soup);
		expect(health.findings.find((f) => f.code === 'open-edges')?.text).toContain('All of them close');
		const mended = weld(soup);
		expect(mended.changed).toBe(240 - 42);
		expect(found(mended.mesh)).toEqual({});
	});

	it('parts that pass through each other, and those that only touch', () => {
		const crossing = merge(sphere(2), sphere(2, 1, [1.2, 0.1, 0.05]));
		expect(found(crossing)['self-intersections']).toBeGreaterThan(20);
		const apart = merge(sphere(2), sphere(2, 1, [2.5, 0, 0]));
		expect(found(apart)['self-intersections']).toBeUndefined();
		// Without time nothing is found, and that is said.
		expect(surfaceHealth(crossing, { intersectionBudget: 1e-9 }).intersectionsSearched).toBeLessThan(1);
	});

	it('self-intersections agree with looking at every pair', () => {
		const mesh = merge(sphere(1), sphere(1, 0.9, [0.7, 0.2, 0.1]));
		const health = surfaceHealth(mesh);
		const listed = health.findings.find((f) => f.code === 'self-intersections')!.places;
		expect(listed).toEqual(crossingPairs(mesh));
	});

	it('a size in the wrong unit is noticed, stray vertices are counted', () => {
		const mesh = sphere(1, 1500);
		expect(found(mesh)).toEqual({ 'unlikely-size': 1 });
		expect(surfaceHealth(mesh).findings[0].text).toContain('3.00 m if the file is in mm');
		expect(surfaceHealth(mesh, { metresPerUnit: 0.001 }).findings).toEqual([]);
		const stray = { ...sphere(1), positions: Float32Array.from([...sphere(1).positions, 1e6, 0, 0]) };
		expect(found(stray)).toEqual({ 'unused-vertices': 1 });
	});
});

/** By the plane of each triangle and the intervals on the common line, written anew for the test. */
function crossingPairs(mesh: RepairMesh): number[] {
	const faces = mesh.triangles.length / 3;
	const corner = (t: number, k: number) => {
		const v = 3 * mesh.triangles[3 * t + k];
		return [mesh.positions[v], mesh.positions[v + 1], mesh.positions[v + 2]];
	};
	const sub = (a: number[], b: number[]) => a.map((x, d) => x - b[d]);
	const dot = (a: number[], b: number[]) => a[0] * b[0] + a[1] * b[1] + a[2] * b[2];
	const cross = (a: number[], b: number[]) => [
		a[1] * b[2] - a[2] * b[1],
		a[2] * b[0] - a[0] * b[2],
		a[0] * b[1] - a[1] * b[0]
	];
	/** Whether the segment meets the triangle, by its parameter and barycentric coordinates. */
	const meets = (p: number[], q: number[], tri: number[][]) => {
		const [u, v] = [sub(tri[1], tri[0]), sub(tri[2], tri[0])];
		const way = sub(q, p);
		const n = cross(u, v);
		const along = dot(n, way);
		if (along === 0) return false;
		const s = dot(n, sub(tri[0], p)) / along;
		const w = sub(
			p.map((x, d) => x + s * way[d]),
			tri[0]
		);
		const nn = dot(n, n);
		const b = dot(cross(w, v), n) / nn;
		const c = dot(cross(u, w), n) / nn;
		return s > 0 && s < 1 && b > 0 && c > 0 && b + c < 1;
	};
	const hit = new Set<number>();
	for (let s = 0; s < faces; s++) {
		for (let t = s + 1; t < faces; t++) {
			const [a, b] = [s, t].map((x) => [0, 1, 2].map((k) => corner(x, k)));
			const shared = [0, 1, 2].some((k) =>
				mesh.triangles.subarray(3 * t, 3 * t + 3).includes(mesh.triangles[3 * s + k])
			);
			if (shared) continue;
			const any = [0, 1, 2].some((k) => meets(a[k], a[(k + 1) % 3], b) || meets(b[k], b[(k + 1) % 3], a));
			if (any) {
				hit.add(s);
				hit.add(t);
			}
		}
	}
	return [...hit].sort((x, y) => x - y);
}
