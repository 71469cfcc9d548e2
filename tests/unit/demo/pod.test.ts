import { beforeAll, describe, expect, it } from 'vitest';
import { podSurface, type DemoSurface } from '$lib/server/demo/pod-mesh';

let pod: DemoSurface;
beforeAll(() => {
	pod = podSurface();
}, 60_000);

const point = (v: number) => [pod.positions[3 * v], pod.positions[3 * v + 1], pod.positions[3 * v + 2]] as const;
type Point = readonly [number, number, number];
const minus = (a: Point, b: Point): Point => [a[0] - b[0], a[1] - b[1], a[2] - b[2]];
const dot = (a: Point, b: Point) => a[0] * b[0] + a[1] * b[1] + a[2] * b[2];
const cross = (a: Point, b: Point): Point => [
	a[1] * b[2] - a[2] * b[1],
	a[2] * b[0] - a[0] * b[2],
	a[0] * b[1] - a[1] * b[0]
];
const corners = (t: number) => [0, 1, 2].map((c) => point(pod.triangles[3 * t + c]));

describe('the demo pod', () => {
	it('is one closed, consistently oriented surface of genus 0', () => {
		const directed = new Set<string>();
		for (let t = 0; t < pod.triangles.length; t += 3) {
			for (let c = 0; c < 3; c++) {
				const edge = `${pod.triangles[t + c]}>${pod.triangles[t + ((c + 1) % 3)]}`;
				directed.add(edge);
			}
		}
		// Every side of every triangle once, and its opposite as well.
		expect(directed.size).toBe(pod.triangles.length);
		expect([...directed].filter((edge) => !directed.has(edge.split('>').reverse().join('>')))).toEqual([]);
		const vertices = pod.positions.length / 3;
		// Euler, 1758: V - E + F = 2 for a surface without handles.
		expect(vertices - directed.size / 2 + pod.triangles.length / 3).toBe(2);
		expect(new Set(pod.triangles).size).toBe(vertices);
	});

	it('has no two vertices in one place, so that welding keeps it', () => {
		const places = new Set<string>();
		for (let v = 0; v < pod.positions.length / 3; v++) places.add(point(v).join());
		expect(places.size).toBe(pod.positions.length / 3);
	});

	it('has about 40,000 triangles, none sharper than 15 degrees', () => {
		const count = pod.triangles.length / 3;
		expect(count).toBeGreaterThan(38_000);
		expect(count).toBeLessThan(42_000);
		let smallest = Math.PI;
		for (let t = 0; t < count; t++) {
			const p = corners(t);
			for (let c = 0; c < 3; c++) {
				const u = minus(p[(c + 1) % 3], p[c]);
				const v = minus(p[(c + 2) % 3], p[c]);
				smallest = Math.min(smallest, Math.acos(dot(u, v) / Math.sqrt(dot(u, u) * dot(v, v))));
			}
		}
		expect((smallest * 180) / Math.PI).toBeGreaterThan(15);
	});

	it('holds 430 litres outward, in the size of a roof pod', () => {
		let volume = 0;
		for (let t = 0; t < pod.triangles.length / 3; t++) {
			const [a, b, c] = corners(t);
			volume += dot(a, cross(b, c)) / 6;
		}
		// mm^3 to litres.
		expect(volume / 1e6).toBeGreaterThan(428);
		expect(volume / 1e6).toBeLessThan(434);
		const extent = [0, 1, 2].map((c) => {
			const values = Array.from({ length: pod.positions.length / 3 }, (_, v) => pod.positions[3 * v + c]);
			return Math.max(...values) - Math.min(...values);
		});
		expect(extent[0]).toBeCloseTo(2190, -2);
		expect(extent[1]).toBeCloseTo(860, -2);
		expect(extent[2]).toBeCloseTo(383, -2);
	});

	it('has its floor flat and its feet in their own patch', () => {
		expect(pod.patches.map((patch) => patch.name)).toEqual(['shell', 'floor', 'feet', 'tail']);
		let next = 0;
		for (const patch of pod.patches) {
			expect(patch.firstTriangle).toBe(next);
			expect(patch.triangleCount).toBeGreaterThan(0);
			next += patch.triangleCount;
		}
		expect(3 * next).toBe(pod.triangles.length);
		const heights = (name: string) => {
			const patch = pod.patches.find((candidate) => candidate.name === name)!;
			const first = 3 * patch.firstTriangle;
			return [...pod.triangles.subarray(first, first + 3 * patch.triangleCount)].map((v) => pod.positions[3 * v + 2]);
		};
		// Flat but for the rounded edge that the patch ends in.
		const floor = heights('floor');
		expect(floor.filter((z) => Math.abs(z) < 0.01).length / floor.length).toBeGreaterThan(0.7);
		expect(Math.min(...floor)).toBeGreaterThan(-0.01);
		expect(Math.min(...heights('feet'))).toBeCloseTo(-38, 3);
	});

	it('is its own mirror image across y = 0', () => {
		const places = new Set<string>();
		for (let v = 0; v < pod.positions.length / 3; v++) places.add(point(v).join());
		const alone = [...places].filter((place) => {
			const [x, y, z] = place.split(',').map(Number);
			return !places.has([x, y === 0 ? 0 : -y, z].join());
		});
		expect(alone).toEqual([]);
	});

	it('is the same every time', () => {
		const again = podSurface();
		expect(Buffer.from(again.positions.buffer).equals(Buffer.from(pod.positions.buffer))).toBe(true);
		expect(Buffer.from(again.triangles.buffer).equals(Buffer.from(pod.triangles.buffer))).toBe(true);
	});
});
