import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { makeSurface, prepareMove, storePositions, toMetres, volumeOf } from '../../../src/lib/morph';
import { nextFloat32 } from '../../../src/lib/morph/store';
import { sequence } from '../../factories/numbers';
import { ellipsoid, makeBox, smoothGradient } from '../../unit/morph/shapes';

const mesh = ellipsoid(3, [1.2, 0.9, 0.7]);
/** Next float32 by counting all of them in order: not the engine's way. */
const bits = new Int32Array(1);
const float = new Float32Array(bits.buffer);
const rank = (x: number) => {
	float[0] = x;
	return bits[0] < 0 ? -2147483648 - bits[0] : bits[0];
};

describe('nextFloat32', () => {
	it('is the neighbour', () => {
		fc.assert(
			fc.property(fc.float({ noNaN: true, noDefaultInfinity: true }), fc.boolean(), (x, up) => {
				const next = nextFloat32(x, up);
				expect(Math.fround(next)).toBe(next);
				expect(up ? next > x : next < x).toBe(true);
				expect(rank(next + 0) - rank(x + 0)).toBe(up ? 1 : -1);
			})
		);
	});
});

describe('storePositions', () => {
	const units = fc.constantFrom(1, 0.001, 0.01, 0.0254);
	const all = Array.from({ length: mesh.positions.length / 3 }, (_, v) => v);
	const moves = (least: number) =>
		fc.record({ unit: units, moved: fc.shuffledSubarray(all, { minLength: least }), seed: fc.nat() });
	const prepare = ({ unit, moved, seed }: { unit: number; moved: number[]; seed: number }) => {
		const next = sequence(seed);
		return {
			filed: Float32Array.from(mesh.positions, (x) => x / unit),
			moved: Uint32Array.from(moved).sort(),
			displacement: Float64Array.from({ length: 3 * moved.length }, () => 0.01 * next())
		};
	};

	it('rounds each moved coordinate to the nearest float32 and keeps every other bit', () => {
		fc.assert(
			fc.property(moves(0), (input) => {
				const { filed, moved, displacement } = prepare(input);
				const kept = filed.slice();
				const { positions, nudges, volumeError } = storePositions(filed, moved, displacement, {
					metresPerUnit: input.unit,
					triangles: mesh.triangles
				});
				expect([nudges, volumeError]).toEqual([0, 0]);
				expect(filed).toEqual(kept);
				const wanted = filed.slice();
				moved.forEach((v, i) => {
					for (let d = 0; d < 3; d++) {
						const dx = displacement[3 * i + d];
						if (dx !== 0) wanted[3 * v + d] = Math.fround((filed[3 * v + d] * input.unit + dx) / input.unit) + 0;
					}
				});
				expect(new Uint8Array(positions.buffer)).toEqual(new Uint8Array(wanted.buffer));
			})
		);
	});

	it('holds a volume by nudging coordinates to neighbours, without leaving the exact result by more than two units in the last place', () => {
		fc.assert(
			fc.property(moves(200), (input) => {
				const { filed, moved, displacement } = prepare(input);
				const metres = toMetres(filed, input.unit);
				const exact = metres.slice();
				moved.forEach((v, i) => {
					for (let d = 0; d < 3; d++) exact[3 * v + d] += displacement[3 * i + d];
				});
				const targetVolume = volumeOf(exact, mesh.triangles);
				const stored = storePositions(filed, moved, displacement, {
					metresPerUnit: input.unit,
					triangles: mesh.triangles,
					targetVolume
				});
				const volume = volumeOf(toMetres(stored.positions, input.unit), mesh.triangles);
				expect(Math.abs(volume / targetVolume - 1)).toBeLessThan(1e-9);
				expect(Math.abs(stored.volumeError - Math.abs(volume / targetVolume - 1))).toBeLessThan(1e-13);
				let apart = 0;
				for (let i = 0; i < exact.length; i++) {
					apart = Math.max(apart, Math.abs(rank(stored.positions[i]) - rank(Math.fround(exact[i] / input.unit))));
				}
				expect(apart).toBeLessThanOrEqual(2);
			}),
			{ numRuns: 30 }
		);
	});

	it('stores no -0', () => {
		const filed = Float32Array.of(1, 0, 0, 0, 1, 0, 0, 0, 1);
		const { positions } = storePositions(filed, Uint32Array.of(0), Float64Array.of(-1, -1e-60, 0), {
			metresPerUnit: 1,
			triangles: Uint32Array.of(0, 1, 2)
		});
		expect(Object.is(positions[0], 0)).toBe(true);
		expect(Object.is(positions[1], 0)).toBe(true);
	});

	it.each([1, 0.001])('keeps a symmetric surface symmetric to the last bit, unit %f m', (unit) => {
		const filed = Float32Array.from(ellipsoid(4, [1.2, 0.9, 0.7]).positions, (x) => x / unit);
		const { triangles } = ellipsoid(4, [1, 1, 1]);
		const surface = makeSurface(toMetres(filed, unit), triangles);
		const move = prepareMove(surface, [makeBox({ centre: [0.5, 0, 0], halfSize: [0.9, 1, 0.8] })], {
			smoothing: 0.1,
			symmetry: { point: [0, 0, 0], normal: [0, 1, 0] }
		}).solve({
			objectives: [{ id: 'drag', gradient: smoothGradient(surface), sense: 'minimise', weight: 1 }],
			step: 0.01,
			constraints: [{ kind: 'volume', bound: 'hold' }]
		});
		const { positions, nudges, volumeError } = storePositions(filed, move.moved, move.displacement, {
			metresPerUnit: unit,
			triangles,
			targetVolume: surface.volume,
			partners: move.partners,
			origin: surface.origin
		});
		expect(nudges).toBeGreaterThan(0);
		expect(volumeError).toBeLessThan(1e-9);
		const key = (p: ArrayLike<number>, sign: number) => `${p[0]} ${sign * p[1] + 0} ${p[2]}`;
		const all = new Set(
			Array.from({ length: positions.length / 3 }, (_, v) => key(positions.subarray(3 * v, 3 * v + 3), 1))
		);
		let pairs = 0;
		for (let v = 0; v < positions.length; v += 3) if (all.has(key(positions.subarray(v, v + 3), -1))) pairs++;
		expect(pairs).toBe(positions.length / 3);
	});
});
