import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { BoxOperator } from '../../../src/lib/morph/operator';
import { sequence } from '../../factories/numbers';
import { ellipsoid, largest, makeBox, turn } from '../../unit/morph/shapes';

const surface = ellipsoid(4, [2.4, 0.9, 0.7]);
const number = (min: number, max: number) => fc.double({ min, max, noNaN: true });
const random = fc.record({
	centre: fc.tuple(number(-2, 2), number(-0.6, 0.6), number(-0.5, 0.5)),
	halfSize: fc.tuple(number(0.4, 1.5), number(0.4, 1), number(0.4, 1)),
	axis: fc.tuple(number(0.1, 1), number(-1, 1), number(-1, 1)),
	angle: number(-3, 3),
	lattice: fc.tuple(...[0, 1, 2].map(() => fc.integer({ min: 2, max: 6 }))) as fc.Arbitrary<[number, number, number]>,
	held: fc.integer({ min: 0, max: 1 }),
	smoothing: number(0, 0.3),
	weighted: fc.boolean(),
	seed: fc.nat()
});

describe('sums by cells', () => {
	it('are the straight sums: metric, projection and evaluation', () => {
		let worst = 0;
		fc.assert(
			fc.property(random, ({ centre, halfSize, axis, angle, lattice, held, smoothing, weighted, seed }) => {
				const box = makeBox({
					centre,
					halfSize,
					lattice,
					rotation: turn(axis, angle),
					held: { u0: lattice[0] > 2 ? held : 0, u1: 0, v0: 0, v1: 0, w0: 0, w1: 0 }
				});
				const next = sequence(seed);
				const weights = weighted ? surface.mass.map(() => 0.5 + 0.5 * next()) : undefined;
				const direct = new BoxOperator(box, surface, weights, 'direct');
				const cells = new BoxOperator(box, surface, weights, 'moments');
				fc.pre(direct.inside.length > 0);
				expect(cells.path).toBe('moments');
				expect(cells.inside).toEqual(direct.inside);
				const compare = (a: Float64Array, b: Float64Array, tolerance: number, scale = largest(b)) => {
					expect(a.length).toBe(b.length);
					const off = largest(a.map((x, i) => x - b[i])) / scale;
					worst = Math.max(worst, off);
					expect(off).toBeLessThan(tolerance);
				};
				compare(cells.metric(surface, smoothing), direct.metric(surface, smoothing), 2e-9);
				const field = surface.positions.map(() => next());
				// Against the size of what is summed: the sum itself may cancel.
				const summed = direct.inside.length;
				compare(cells.project(field), direct.project(field), 2e-11, summed);
				const points = Float64Array.from({ length: 3 * direct.pointCount }, () => next());
				compare(cells.evaluate(points), direct.evaluate(points), 1e-10, 1);
				// One is the other's transpose: f . B q = B'f . q
				const inside = new Float64Array(3 * summed);
				direct.inside.forEach((v, i) => inside.set(field.subarray(3 * v, 3 * v + 3), 3 * i));
				const left = cells.evaluate(points).reduce((s, x, i) => s + x * inside[i], 0);
				const right = cells.project(field).reduce((s, x, i) => s + x * points[i], 0);
				expect(Math.abs(left - right)).toBeLessThan(1e-11 * (1 + summed));
			}),
			{ numRuns: 40 }
		);
		// What is really lost (docs/numerics.md).
		expect(worst).toBeLessThan(1e-9);
	});
});
