import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import {
	CurvatureProbe,
	lockWeights,
	patchVolume,
	prepareKeepOut,
	selfIntersections,
	volumeOf,
	type KeepOutGeometry
} from '$lib/morph';
import { cube, icosphere, turn } from '../../unit/morph/shapes';

const number = (min: number, max: number) => fc.double({ min, max, noNaN: true });
const vector = (size: number) => fc.tuple(number(-size, size), number(-size, size), number(-size, size));
const direction = vector(1).filter((v) => Math.hypot(...v) > 0.1);
const unit = (v: readonly number[]) => v.map((x) => x / Math.hypot(...v)) as [number, number, number];

const ball = icosphere(3);
const geometry: fc.Arbitrary<KeepOutGeometry> = fc.oneof(
	fc.record({ kind: fc.constant('halfSpace' as const), point: vector(1), normal: direction.map(unit) }),
	fc.record({
		kind: fc.constant('box' as const),
		centre: vector(1),
		halfSize: fc.tuple(number(0.05, 1), number(0.05, 1), number(0.05, 1)),
		rotation: fc.tuple(direction, number(-3, 3)).map(([axis, angle]) => turn(axis, angle))
	}),
	fc
		.record({ scale: fc.tuple(number(0.2, 1), number(0.2, 1), number(0.2, 1)), at: vector(1) })
		.map(({ scale, at }) => ({
			kind: 'mesh' as const,
			positions: ball.positions.map((x, i) => scale[i % 3] * x + at[i % 3]),
			triangles: ball.triangles
		}))
);

/** Turned about an axis through the origin, scaled, shifted. */
function placed(
	positions: Float64Array,
	axis: readonly number[],
	angle: number,
	scale: number,
	shift: readonly number[]
) {
	const [x, y, z, w] = turn(unit(axis), angle);
	const out = new Float64Array(positions.length);
	for (let v = 0; v < out.length; v += 3) {
		const [a, b, c] = positions.subarray(v, v + 3);
		const [tx, ty, tz] = [2 * (y * c - z * b), 2 * (z * a - x * c), 2 * (x * b - y * a)];
		out[v] = scale * (a + w * tx + y * tz - z * ty) + shift[0];
		out[v + 1] = scale * (b + w * ty + z * tx - x * tz) + shift[1];
		out[v + 2] = scale * (c + w * tz + x * ty - y * tx) + shift[2];
	}
	return out;
}

describe('distances to keep-outs', () => {
	it('change no faster than the place, have unit gradients, and turn their sign with the side', () => {
		fc.assert(
			fc.property(geometry, fc.array(vector(2.5), { minLength: 2, maxLength: 12 }), (shape, places) => {
				const n = places.length;
				const points = Float64Array.from(places.flat());
				const [d, e] = [new Float64Array(n), new Float64Array(n)];
				const [g, h] = [new Float64Array(3 * n), new Float64Array(3 * n)];
				prepareKeepOut(shape, 'outside', 0).distance(points, n, 100, d, g);
				prepareKeepOut(shape, 'inside', 0).distance(points, n, 100, e, h);
				for (let i = 0; i < n; i++) {
					expect(e[i]).toBeCloseTo(-d[i], 12);
					expect(Math.hypot(...g.subarray(3 * i, 3 * i + 3))).toBeCloseTo(1, 9);
					for (let j = 0; j < i; j++) {
						const way = Math.hypot(...places[i].map((x, k) => x - places[j][k]));
						expect(Math.abs(d[i] - d[j])).toBeLessThanOrEqual(way + 1e-12);
					}
				}
			}),
			{ numRuns: 150 }
		);
	});

	it('a limit hides what lies beyond it and nothing else', () => {
		fc.assert(
			fc.property(
				geometry,
				fc.array(vector(2.5), { minLength: 1, maxLength: 20 }),
				number(0.01, 1),
				(shape, places, limit) => {
					const n = places.length;
					const points = Float64Array.from(places.flat());
					for (const side of ['outside', 'inside'] as const) {
						const [d, e] = [new Float64Array(n), new Float64Array(n)];
						const prepared = prepareKeepOut(shape, side, 0);
						prepared.distance(points, n, 100, d, new Float64Array(3 * n));
						prepared.distance(points, n, limit, e, new Float64Array(3 * n));
						for (let i = 0; i < n; i++) expect(e[i]).toBeCloseTo(Math.min(d[i], limit), 12);
					}
				}
			),
			{ numRuns: 100 }
		);
	});
});

describe('what does not depend on where the surface stands', () => {
	const placing = fc.tuple(direction, number(-3, 3), number(0.1, 10), vector(5));

	it('curvature times size', () => {
		const shape = { ...ball, positions: ball.positions.map((x, i) => x * [2, 1, 0.7][i % 3]) };
		const ids = Uint32Array.from({ length: shape.positions.length / 3 }, (_, v) => v);
		const probe = new CurvatureProbe(shape.triangles, ids.length, ids);
		const at = probe.at(shape.positions);
		fc.assert(
			fc.property(placing, ([axis, angle, scale, shift]) => {
				const there = probe.at(placed(shape.positions, axis, angle, scale, shift));
				for (let v = 0; v < ids.length; v += 7) {
					expect(scale * there.largest[v]).toBeCloseTo(at.largest[v], 6);
					expect(scale * there.smallest[v]).toBeCloseTo(at.smallest[v], 6);
				}
			}),
			{ numRuns: 30 }
		);
	});

	it('a lock’s weights, its blend distance scaled with the surface', () => {
		const lock = { triangles: Uint32Array.of(0, 5, 17), blend: 0.8 };
		const at = lockWeights(ball.positions, ball.triangles, [lock]);
		fc.assert(
			fc.property(placing, ([axis, angle, scale, shift]) => {
				const there = placed(ball.positions, axis, angle, scale, shift);
				const weights = lockWeights(there, ball.triangles, [{ ...lock, blend: scale * lock.blend }]);
				for (let v = 0; v < at.length; v++) expect(weights[v]).toBeCloseTo(at[v], 6);
			}),
			{ numRuns: 30 }
		);
	});

	it('the volume of a part over the scale cubed', () => {
		const part = Uint32Array.from({ length: ball.triangles.length / 3 }, (_, t) => t).filter(
			(t) => ball.positions[3 * ball.triangles[3 * t]] > 0.2
		);
		const at = patchVolume(ball.positions, ball.triangles, part).volume;
		fc.assert(
			fc.property(placing, ([axis, angle, scale, shift]) => {
				const there = patchVolume(placed(ball.positions, axis, angle, scale, shift), ball.triangles, part);
				expect(there.volume / scale ** 3).toBeCloseTo(at, 8);
			}),
			{ numRuns: 30 }
		);
	});
});

describe('parts of a body', () => {
	it('cut along one loop, a part and the rest make the whole', () => {
		fc.assert(
			fc.property(direction, number(-0.6, 0.6), (axis, level) => {
				const n = unit(axis);
				const side = (t: number) => {
					let sum = 0;
					for (let k = 0; k < 3; k++)
						for (let d = 0; d < 3; d++) sum += (n[d] * ball.positions[3 * ball.triangles[3 * t + k] + d]) / 3;
					return sum > level;
				};
				const ids = Uint32Array.from({ length: ball.triangles.length / 3 }, (_, t) => t);
				const volume = (chosen: Uint32Array) => {
					try {
						return patchVolume(ball.positions, ball.triangles, chosen);
					} catch {
						return null;
					}
				};
				const [one, rest] = [volume(ids.filter(side)), volume(ids.filter((t) => !side(t)))];
				// A cut through a vertex twice is refused; tested elsewhere.
				fc.pre(one !== null && rest !== null && one.caps === 1 && rest.caps === 1);
				expect(one!.volume + rest!.volume).toBeCloseTo(volumeOf(ball.positions, ball.triangles), 12);
			}),
			{ numRuns: 60 }
		);
	});
});

describe('crossings', () => {
	it('two boxes cross when their surfaces do, and never when one lies apart from or within the other', () => {
		const one = cube(2);
		const n = one.positions.length / 3;
		const triangles = Uint32Array.from([...one.triangles, ...one.triangles.map((v) => v + n)]);
		fc.assert(
			fc.property(vector(2), number(0.2, 0.9), (shift, size) => {
				const other = one.positions.map((x, i) => size * (x - 0.5) + 0.5 + shift[i % 3]);
				const low = shift.map((s) => 0.5 - size / 2 + s);
				const high = shift.map((s) => 0.5 + size / 2 + s);
				const clear = 1e-6;
				// Faces in one plane, or edges that just touch, are nothing to decide here.
				fc.pre(
					[...low, ...high].every((x) => Math.abs(x) > clear && Math.abs(x - 1) > clear && Math.abs(x - 0.5) > clear)
				);
				const apart = low.some((x) => x > 1) || high.some((x) => x < 0);
				const within = low.every((x) => x > 0) && high.every((x) => x < 1);
				const found = selfIntersections(Float64Array.from([...one.positions, ...other]), triangles);
				expect(found.count > 0).toBe(!apart && !within);
			}),
			{ numRuns: 200 }
		);
	});
});
