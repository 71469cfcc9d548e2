import { describe, expect, it } from 'vitest';
import { applyFrame, applyFrameToVectors, suspectFrame, type FrameTransform } from '$lib/formats/frames';
import { ellipsoid } from '../../factories/surfaces';

/** A body without symmetry, away from the origin. */
const base = ellipsoid(4, [2.4, 0.9, 0.7]);
const positions = Float32Array.from(base.positions);
for (let i = 0; i < positions.length; i += 3) {
	const [x, y, z] = positions.subarray(i, i + 3);
	positions[i] = x + 0.2 * y * y + 1;
	positions[i + 1] = y * (1 + 0.15 * x) + 0.3;
	positions[i + 2] = z * (1 + 0.1 * x + 0.2 * y) + (z > 0 ? 0.3 * z * z : 0) + 0.8;
}
const mesh = { positions, triangles: Uint32Array.from(base.triangles) };
const I = [1, 0, 0, 0, 1, 0, 0, 0, 1];

/** What the doctor's mend must undo. */
const wrong = (scale: number, axes: number[], shift: [number, number, number]): Float64Array =>
	applyFrame(positions, { axes, scale, shift });

describe('the doctor of frames', () => {
	it('has nothing to say about a map that lies on the surface', () => {
		expect(suspectFrame(positions, mesh)).toEqual([]);
		const near = Float64Array.from(positions, (x, i) => x + 0.002 * Math.sin(i));
		expect(suspectFrame(near, mesh)).toEqual([]);
	});

	const cases: [string, number, number[], [number, number, number], RegExp][] = [
		['millimetres', 1000, I, [0, 0, 0], /millimetres where the surface is in metres/],
		['metres for a surface in millimetres', 0.001, I, [0, 0, 0], /metres where the surface is in millimetres/],
		['inches', 1 / 25.4, I, [0, 0, 0], /inches where the surface is in millimetres/],
		['millimetres for a surface in inches', 25.4, I, [0, 0, 0], /millimetres where the surface is in inches/],
		['mirrored in y', 1, [1, 0, 0, 0, -1, 0, 0, 0, 1], [0, 0, 0], /mirrored in y/],
		['y and z exchanged', 1, [1, 0, 0, 0, 0, 1, 0, 1, 0], [0, 0, 0], /are the surface's \(x, z, y\)/],
		['y up instead of z up', 1, [1, 0, 0, 0, 0, 1, 0, -1, 0], [0, 0, 0], /are the surface's/],
		['shifted', 1, I, [-1.4, 0.7, 12], /shifted by \(-1.4, 0.7, 12\)/],
		['millimetres and mirrored', 1000, [1, 0, 0, 0, -1, 0, 0, 0, 1], [0, 0, 0], /millimetres.*mirrored in y/],
		['millimetres and shifted', 1000, I, [2500, 0, 0], /millimetres.*shifted by \(2\.5, .*\)/]
	];

	it.each(cases)('%s', (_, scale, axes, shift, words) => {
		const fixes = suspectFrame(wrong(scale, axes, shift), mesh);
		expect(fixes.length).toBeGreaterThan(0);
		const [best] = fixes;
		expect(best.text).toMatch(words);
		expect(best.after).toBeGreaterThan(0.99);
		expect(best.before).toBeLessThan(0.9);
		const back = applyFrame(wrong(scale, axes, shift), best.transform);
		let worst = 0;
		back.forEach((x, i) => (worst = Math.max(worst, Math.abs(x - positions[i]))));
		expect(worst).toBeLessThan(0.005);
	});

	it('works on a map of one half of the surface, in millimetres', () => {
		const half: number[] = [];
		for (let i = 0; i < positions.length; i += 3)
			if (positions[i] > 1) half.push(...positions.subarray(i, i + 3).map((x) => 1000 * x));
		const [best] = suspectFrame(half, mesh);
		expect(best.transform).toEqual({ axes: I, scale: 0.001, shift: [0, 0, 0] });
	});

	it('points from elsewhere get no mend', () => {
		let state = 5;
		const random = () => ((state = (Math.imul(state, 1103515245) + 12345) >>> 0) / 4294967296) * 2 - 1;
		const cloud = Float64Array.from({ length: 3000 }, () => 7 * random());
		expect(suspectFrame(cloud, mesh)).toEqual([]);
	});

	it('vectors turn with the axes only', () => {
		const transform: FrameTransform = { axes: [0, 1, 0, -1, 0, 0, 0, 0, 1], scale: 0.001, shift: [5, 6, 7] };
		expect([...applyFrameToVectors([1, 2, 3], transform)]).toEqual([2, -1, 3]);
		expect([...applyFrame([1000, 2000, 3000], transform)]).toEqual([7, 5, 10]);
	});
});
