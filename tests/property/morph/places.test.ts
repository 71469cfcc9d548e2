import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import {
	MorphError,
	applyDisplacement,
	prepareKeepOut,
	prepareMove,
	type KeepOutGeometry,
	type MoveConstraint,
	type MoveObjective
} from '../../../src/lib/morph';
import { ellipsoid, makeBox, turn } from '../../unit/morph/shapes';

const number = (min: number, max: number) => fc.double({ min, max, noNaN: true });
const surface = ellipsoid(4, [2.4, 0.9, 0.7]);
const STEP = 0.02;
/** What float32 coordinates of this size tell apart, and a share of the step: the engine's guard. */
const GUARD = 2 * 1.2e-7 * 2.4 + 1e-6 * STEP;

const gradient = (wave: readonly number[], bias: number) => {
	const out = new Float64Array(surface.positions.length);
	for (let v = 0; v < surface.mass.length; v++) {
		const [x, y, z] = surface.positions.subarray(3 * v, 3 * v + 3);
		const s = surface.mass[v] * (Math.sin(wave[0] * x + wave[1] * y + wave[2] * z) + bias + 0.1 * x);
		for (let d = 0; d < 3; d++) out[3 * v + d] = s * surface.normals[3 * v + d];
	}
	return out;
};

const random = fc.record({
	/** Box and keep-out stand at a vertex. */
	vertex: fc.integer({ min: 0, max: surface.mass.length - 1 }),
	halfSize: fc.tuple(number(0.5, 1.2), number(0.5, 1), number(0.5, 1)),
	axis: fc.tuple(number(0.1, 1), number(-1, 1), number(-1, 1)),
	angle: number(-3, 3),
	lattice: fc.tuple(...[0, 1, 2].map(() => fc.integer({ min: 3, max: 5 }))) as fc.Arbitrary<[number, number, number]>,
	/** How far the keep-out is from the vertex, outward. */
	gap: number(0, 0.015),
	clearance: number(0, 0.005),
	tilt: number(-0.2, 0.2),
	kind: fc.constantFrom('halfSpace' as const, 'box' as const),
	volume: fc.boolean(),
	inward: fc.option(number(0.002, 0.02), { nil: undefined }),
	wave: fc.tuple(number(-3, 3), number(-3, 3), number(-3, 3)),
	bias: number(-2, 0.5)
});

describe('places in random boxes', () => {
	it('are kept to the guard, and cost what they cost', () => {
		let solved = 0;
		let touched = 0;
		fc.assert(
			fc.property(random, (r) => {
				const at = Array.from(surface.positions.subarray(3 * r.vertex, 3 * r.vertex + 3));
				const normal = Array.from(surface.normals.subarray(3 * r.vertex, 3 * r.vertex + 3));
				const tilted = normal.map((x, d) => x + (d === 0 ? r.tilt : 0));
				const inward = tilted.map((x) => -x / Math.hypot(...tilted)) as [number, number, number];
				// The farthest vertex towards the keep-out, so that the parent keeps it.
				let reach = -Infinity;
				for (let v = 0; v < surface.positions.length; v += 3) {
					reach = Math.max(reach, -inward.reduce((s, x, d) => s + x * surface.positions[v + d], 0));
				}
				const away = reach + r.gap + r.clearance;
				const point = inward.map((x) => -x * away) as [number, number, number];
				const geometry: KeepOutGeometry =
					r.kind === 'halfSpace'
						? { kind: 'halfSpace', point, normal: inward }
						: {
								kind: 'box',
								centre: at.map((x, d) => x + normal[d] * (0.3 + r.gap + r.clearance)) as [number, number, number],
								halfSize: [0.2, 0.25, 0.15],
								rotation: turn(r.axis, r.angle)
							};
				const keepOut = prepareKeepOut(geometry, 'outside', r.clearance);
				const box = makeBox({
					centre: at as [number, number, number],
					halfSize: r.halfSize,
					lattice: r.lattice,
					rotation: turn(r.axis, r.angle)
				});
				const constraints: MoveConstraint[] = [
					{ kind: 'keepOut', label: 'rail', limit: r.clearance, source: keepOut },
					...(r.volume ? [{ kind: 'volume', bound: 'hold' } as const] : []),
					...(r.inward === undefined ? [] : [{ kind: 'displacement', inward: r.inward } as const])
				];
				const objectives: MoveObjective[] = [
					{ id: 'drag', gradient: gradient(r.wave, r.bias), sense: 'minimise', weight: 1 }
				];
				const prepared = prepareMove(surface, [box], { smoothing: 0.1 });
				const distances = (positions: Float64Array) => {
					const out = new Float64Array(surface.mass.length);
					keepOut.distance(positions, out.length, Infinity, out, new Float64Array(3 * out.length));
					return out;
				};
				const before = distances(surface.positions);
				let move;
				try {
					move = prepared.solve({ objectives, step: STEP, constraints });
				} catch (error) {
					expect(error).toBeInstanceOf(MorphError);
					expect(['constraint-conflict', 'step-unreachable']).toContain((error as MorphError).code);
					return;
				}
				solved++;
				const after = distances(applyDisplacement(surface.positions, move.moved, move.displacement));
				for (const v of move.moved) {
					// No nearer than the clearance, or than the parent was.
					expect(after[v]).toBeGreaterThan(Math.min(r.clearance, before[v]) - GUARD);
				}
				if (r.inward !== undefined) {
					move.moved.forEach((v, i) => {
						let along = 0;
						for (let d = 0; d < 3; d++) along += move.displacement[3 * i + d] * surface.normals[3 * v + d];
						expect(along).toBeGreaterThan(-r.inward! - GUARD);
					});
				}
				if (r.volume) expect(Math.abs(move.volumeAfter / surface.volume - 1)).toBeLessThan(1e-12);
				for (const report of move.constraints) {
					expect(report.kept).toBe(true);
					if (report.kind !== 'volume') expect(report.price).toBeGreaterThanOrEqual(0);
				}
				if (move.constraints[0].active) touched++;
				// At the same length in the metric, nothing descends more than the free direction.
				const free = prepared.solve({ objectives, step: STEP, constraints: [] });
				const slope = (m: typeof free) => m.predictedWeighted / m.metricLength;
				expect(slope(move)).toBeGreaterThan(slope(free) * (1 + 1e-6));
			}),
			{ numRuns: 30 }
		);
		expect(solved).toBeGreaterThan(15);
		expect(touched).toBeGreaterThan(0);
	}, 240_000);

	// A bound a little below the step: the violation wanders from place to place before it falls.
	it('are kept where many bind one after the other', () => {
		const box = makeBox({
			centre: [1.3, 0, 0.1],
			halfSize: [1.2, 1, 0.9],
			lattice: [5, 5, 5],
			held: { u0: 2, u1: 0, v0: 0, v1: 0, w0: 0, w1: 0 }
		});
		const bound = 0.9 * STEP;
		const move = prepareMove(surface, [box], { smoothing: 0.05 }).solve({
			objectives: [{ id: 'drag', gradient: gradient([3, 2, 1], 0), sense: 'minimise', weight: 1 }],
			step: STEP,
			constraints: [
				{ kind: 'volume', bound: 'hold' },
				{ kind: 'displacement', inward: bound, outward: bound }
			]
		});
		expect(move.constraints.every((c) => c.kept)).toBe(true);
		expect(move.constraints.filter((c) => c.active).length).toBeGreaterThan(1);
		expect(move.maxDisplacement).toBeGreaterThan(bound);
	});
});
