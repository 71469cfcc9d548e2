import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { controlPoints, latticeMotion, type DesignBox } from '../../../src/lib/morph';
import { bernsteinBasis, bsplineBasis, evaluateBasis, type Basis } from '../../../src/lib/morph/basis';
import { makeBox, turn } from '../../unit/morph/shapes';

const unit = fc.double({ min: 0, max: 1, noNaN: true });
const signed = fc.double({ min: -1, max: 1, noNaN: true });
const vector = fc.tuple(signed, signed, signed);
const basis: fc.Arbitrary<Basis> = fc.oneof(
	fc.integer({ min: 2, max: 20 }).map(bernsteinBasis),
	fc
		.tuple(fc.integer({ min: 4, max: 20 }), fc.integer({ min: 1, max: 3 }))
		.map(([count, degree]) => bsplineBasis(count, degree))
);
const at = (b: Basis, t: number) => {
	const values = new Float64Array(b.count);
	const slopes = new Float64Array(b.count);
	evaluateBasis(b, t, values, slopes);
	return { values, slopes };
};
const sum = (values: Float64Array, by: (i: number) => number = () => 1) => values.reduce((s, v, i) => s + v * by(i), 0);

const box: fc.Arbitrary<DesignBox> = fc
	.record({
		centre: vector,
		halfSize: fc.tuple(...[0, 1, 2].map(() => fc.double({ min: 0.2, max: 2, noNaN: true }))) as fc.Arbitrary<
			[number, number, number]
		>,
		axis: vector.filter((v) => Math.hypot(...v) > 0.1),
		angle: fc.double({ min: -3, max: 3, noNaN: true }),
		lattice: fc.tuple(...[0, 1, 2].map(() => fc.integer({ min: 4, max: 8 }))) as fc.Arbitrary<[number, number, number]>,
		basis: fc.constantFrom('bernstein' as const, 'bspline' as const),
		degree: fc.integer({ min: 1, max: 3 })
	})
	.map(({ axis, angle, ...rest }) => makeBox({ ...rest, rotation: turn(axis, angle) }));

describe('bases', () => {
	it('are positive, sum to one, and reproduce t by their Greville abscissae', () => {
		fc.assert(
			fc.property(basis, unit, (b, t) => {
				const { values, slopes } = at(b, t);
				expect(values.every((v) => v >= -1e-15)).toBe(true);
				expect(Math.abs(sum(values) - 1)).toBeLessThan(1e-13);
				expect(Math.abs(sum(values, (i) => b.greville[i]) - t)).toBeLessThan(1e-13);
				expect(Math.abs(sum(slopes))).toBeLessThan(1e-11);
				expect(Math.abs(sum(slopes, (i) => b.greville[i]) - 1)).toBeLessThan(1e-11);
			})
		);
	});

	it('have the slopes that differences show', () => {
		fc.assert(
			fc.property(basis, fc.double({ min: 0.01, max: 0.99, noNaN: true }), (b, t) => {
				const h = 1e-6;
				// Not across a knot, where the slope of a spline of degree 1 jumps.
				fc.pre(!b.knots || b.knots.every((u) => Math.abs(u - t) > 2 * h));
				const { slopes } = at(b, t);
				const [left, right] = [at(b, t - h).values, at(b, t + h).values];
				slopes.forEach((s, i) =>
					expect(Math.abs((right[i] - left[i]) / (2 * h) - s)).toBeLessThan(1e-6 * b.count ** 2)
				);
			})
		);
	});
});

describe('boxes', () => {
	it('move by an affine lattice affinely, wherever they stand', () => {
		fc.assert(
			fc.property(
				box,
				fc.tuple(vector, vector, vector),
				vector,
				fc.array(fc.tuple(unit, unit, unit), { maxLength: 20 }),
				(b, m, shift, inside) => {
					const field = (p: ArrayLike<number>) =>
						m.map((row, d) => row[0] * p[0] + row[1] * p[1] + row[2] * p[2] + shift[d]);
					const points = controlPoints(b);
					const lattice = new Float64Array(points.length);
					for (let p = 0; p < points.length; p += 3) lattice.set(field(points.subarray(p, p + 3)), p);
					// Points of the box between its corners, which are those of the lattice too.
					const [nu, nv, nw] = b.lattice;
					const corner = (i: number, j: number, k: number) => {
						const p = 3 * ((i * (nu - 1) * nv + j * (nv - 1)) * nw + k * (nw - 1));
						return points.subarray(p, p + 3);
					};
					const origin = corner(0, 0, 0);
					const edges = [corner(1, 0, 0), corner(0, 1, 0), corner(0, 0, 1)];
					const positions = Float64Array.from(
						inside.flatMap((t) =>
							[0, 1, 2].map(
								(d) => origin[d] + edges.reduce((s, e, k) => s + (0.001 + 0.998 * t[k]) * (e[d] - origin[d]), 0)
							)
						)
					);
					const motion = latticeMotion(positions, b);
					expect(motion.inside.length).toBe(inside.length);
					const moved = motion.displace(lattice);
					for (let v = 0; v < positions.length; v += 3) {
						field(positions.subarray(v, v + 3)).forEach((x, d) =>
							expect(Math.abs(moved[v + d] - x)).toBeLessThan(1e-12 * 20)
						);
					}
				}
			)
		);
	});

	it.each([1, 2, 3])(
		'%i held planes: the displacement starts with that power of the distance from the face',
		(held) => {
			fc.assert(
				fc.property(box, fc.tuple(unit, unit), fc.infiniteStream(signed), (b, [v, w], numbers) => {
					const [nu, nv, nw] = b.lattice;
					const lattice = Float64Array.from({ length: 3 * nu * nv * nw }, (_, i) =>
						i < 3 * held * nv * nw ? 0 : (numbers.next().value as number)
					);
					const still = { ...b, rotation: [0, 0, 0, 1] as [number, number, number, number], centre: b.halfSize };
					const size = (t: number) => {
						const p = [t, v, w].map((x, d) => 2 * b.halfSize[d] * x);
						const moved = latticeMotion(Float64Array.from(p), still).displace(lattice);
						return Math.hypot(...moved);
					};
					// A polynomial (of one span) without its lowest powers: bounded by a constant times t to that power.
					for (const t of [1e-2, 1e-3]) expect(size(t)).toBeLessThan(3 * 8 ** 3 * nu ** held * t ** held);
				})
			);
		}
	);
});
