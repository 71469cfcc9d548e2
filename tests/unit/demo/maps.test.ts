import { beforeAll, describe, expect, it } from 'vitest';
import { density, mapCsv, sampleMap } from '$lib/server/demo/maps';
import { podDistance } from '$lib/server/demo/pod';
import { podSurface, type DemoSurface } from '$lib/server/demo/pod-mesh';

let pod: DemoSurface;
let drag: Float64Array;
beforeAll(() => {
	pod = podSurface();
	drag = sampleMap('drag', pod);
}, 60_000);

/** Mean of a map over the vertices for which a condition holds. */
const mean = (values: Float64Array, holds: (x: number, y: number, z: number) => boolean) => {
	let sum = 0;
	let count = 0;
	values.forEach((value, v) => {
		if (!holds(pod.positions[3 * v], pod.positions[3 * v + 1], pod.positions[3 * v + 2])) return;
		sum += value;
		count++;
	});
	return sum / count;
};

describe('the invented maps', () => {
	it('says that drag rises outward at the nose’s shoulder and falls at the tail’s', () => {
		expect(mean(drag, (x, _, z) => x > -980 && x < -880 && z > 180)).toBeGreaterThan(1000);
		expect(mean(drag, (x, _, z) => x > 500 && x < 620 && z > 220)).toBeLessThan(-1000);
		expect(mean(drag, (x, _, z) => x > 900 && x < 960 && z > 200)).toBeGreaterThan(1000);
	});

	it('is noisy from vertex to vertex, the same every time', () => {
		expect([...sampleMap('drag', pod)]).toEqual([...drag]);
		const flat = drag.filter((_, v) => {
			const x = pod.positions[3 * v];
			return Math.abs(x) < 150 && pod.positions[3 * v + 2] === 0;
		});
		const middle = flat.reduce((sum, value) => sum + value, 0) / flat.length;
		const deviation = Math.sqrt(flat.reduce((sum, value) => sum + (value - middle) ** 2, 0) / flat.length);
		expect(deviation).toBeGreaterThan(15);
		expect(deviation).toBeLessThan(150);
	});

	it('promises less where the surface has already followed it', () => {
		const at = [0.93, 0, 0.28] as const;
		const lift = podDistance(...at);
		const up = [0, 0, 1] as const;
		const before = density('drag', [at[0], at[1], at[2] - lift], up);
		const after = density('drag', [at[0], at[1], at[2] - lift - 0.004], up);
		expect(before).toBeGreaterThan(0);
		expect(after).toBeGreaterThan(0);
		expect(after).toBeLessThan(0.9 * before);
	});

	it('writes a CSV that names its vertices exactly and says that it is invented', () => {
		const lines = new TextDecoder()
			.decode(mapCsv('drag', 0, pod))
			.trimEnd()
			.split('\n');
		expect(lines[0]).toMatch(/^# INVENTED/);
		expect(lines[2]).toBe('x,y,z,sensitivity');
		const rows = lines.slice(3).map((line) => line.split(',').map(Number));
		expect(rows).toHaveLength(pod.positions.length / 3);
		const wrong = rows.filter(
			([x, y, z, value], v) =>
				[x, y, z].some((coordinate, c) => Math.fround(coordinate) !== pod.positions[3 * v + c]) ||
				!(Math.abs(value - drag[v]) <= 1e-6 * Math.abs(drag[v]))
		);
		expect(wrong).toEqual([]);
	});
});
