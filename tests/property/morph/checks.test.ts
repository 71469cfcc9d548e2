import fc from 'fast-check';
import { Triangle, Vector3 } from 'three';
import { describe, expect, it } from 'vitest';
import { checkMove } from '../../../src/lib/morph';
import { icosphere } from '../../unit/morph/shapes';

const mesh = icosphere(1);
const vertices = mesh.positions.length / 3;

/** The same by the vectors and angles of three.js, triangle by triangle. */
function byThree(before: Float64Array, after: Float64Array, chosen: (t: number) => boolean) {
	let flipped = 0;
	let smallest = Infinity;
	let place = -1;
	for (let t = 0; t < mesh.triangles.length / 3; t++) {
		if (!chosen(t)) continue;
		const of = (p: Float64Array) =>
			new Triangle(
				...([0, 1, 2].map((k) => new Vector3().fromArray(p, 3 * mesh.triangles[3 * t + k])) as [
					Vector3,
					Vector3,
					Vector3
				])
			);
		const [was, is] = [of(before), of(after)];
		if (was.getNormal(new Vector3()).dot(is.getNormal(new Vector3())) <= 0) flipped++;
		const corners = [is.a, is.b, is.c];
		corners.forEach((p, k) => {
			const u = corners[(k + 1) % 3].clone().sub(p);
			const v = corners[(k + 2) % 3].clone().sub(p);
			const angle = (u.angleTo(v) * 180) / Math.PI;
			if (angle < smallest) [smallest, place] = [angle, t];
		});
	}
	return { flipped, smallest, place };
}

describe('checks of the moved surface', () => {
	it('are what three.js says of every triangle', () => {
		const displacement = fc.array(fc.double({ min: -0.4, max: 0.4, noNaN: true }), {
			minLength: 3 * vertices,
			maxLength: 3 * vertices
		});
		const chosen = fc.uniqueArray(fc.integer({ min: 0, max: vertices - 1 }), { minLength: 1 });
		fc.assert(
			fc.property(displacement, chosen, fc.double({ min: 0.5, max: 40, noNaN: true }), (d, moved, minAngle) => {
				const after = mesh.positions.slice();
				for (const v of moved) for (let k = 0; k < 3; k++) after[3 * v + k] += d[3 * v + k];
				const set = new Set(moved);
				const wanted = byThree(mesh.positions, after, (t) => [0, 1, 2].some((k) => set.has(mesh.triangles[3 * t + k])));
				const checks = checkMove({
					before: mesh.positions,
					after,
					triangles: mesh.triangles,
					moved: Uint32Array.from(moved.sort((a, b) => a - b)),
					minAngle
				});
				expect(checks.flipped.value).toBe(wanted.flipped);
				expect(checks.flipped).toMatchObject({ ok: wanted.flipped === 0, hard: true, limit: 0 });
				expect(Math.abs(checks.minAngle.value - wanted.smallest)).toBeLessThan(1e-5);
				expect(checks.minAngle.ok).toBe(checks.minAngle.value >= minAngle);
				expect(checks.minAngle.count > 0).toBe(!checks.minAngle.ok);
			})
		);
	});

	it('know equilateral and right triangles, in any unit', () => {
		const equilateral = Float64Array.of(0, 0, 0, 2, 0, 0, 1, Math.sqrt(3), 0);
		const right = Float64Array.of(0, 0, 0, 1, 0, 0, 0, 1, 0);
		const triangles = Uint32Array.of(0, 1, 2);
		const angle = (p: Float64Array) => checkMove({ before: p, after: p, triangles, metresPerUnit: 1e-3 }).minAngle;
		expect(angle(equilateral).value).toBeCloseTo(60, 5);
		expect(angle(right).value).toBeCloseTo(45, 5);
		// Places are metres.
		expect(angle(right).place!.position.map((x) => 3e3 * x)).toEqual([1, 1, 0].map((x) => expect.closeTo(x, 9)));
	});

	it('see a collapsed triangle and one turned over; leave out what had no area before', () => {
		const before = Float64Array.of(0, 0, 0, 1, 0, 0, 0, 1, 0, 2, 0, 0);
		const triangles = Uint32Array.of(0, 1, 2, 0, 1, 3);
		const collapsed = before.slice();
		collapsed.set([0.5, 0, 0], 6);
		const flat = checkMove({ before, after: collapsed, triangles });
		expect(flat.flipped).toMatchObject({ value: 1, ok: false, place: { triangle: 0 } });
		expect(flat.minAngle.value).toBeCloseTo(0, 5);
		expect(flat.minAngle.ok).toBe(false);
		const over = before.slice();
		over.set([0, -1, 0], 6);
		expect(checkMove({ before, after: over, triangles }).flipped.value).toBe(1);
		const still = checkMove({ before, after: before, triangles });
		expect([still.flipped.value, still.minAngle.ok, still.flipped.place]).toEqual([0, true, null]);
	});
});
