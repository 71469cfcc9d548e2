import { describe, expect, it } from 'vitest';
import {
	makeSurface,
	patchVolume,
	prepareMove,
	volumeOf,
	type MoveConstraint,
	type MoveObjective,
	type Surface
} from '../../../src/lib/morph';
import type { PlaceRows, PlaceSource } from '../../../src/lib/morph/place-rows';
import { ellipsoid, makeBox, revolution, smoothGradient } from '../../unit/morph/shapes';

/** Everything above a plane z = level is forbidden: slack = level - z - clearance. */
function ceiling(level: number, clearance: number): PlaceSource {
	return {
		place: (vertices) => ({
			rows(positions, within): PlaceRows {
				const ids = vertices.filter((v) => level - positions[3 * v + 2] - clearance < within);
				return {
					count: ids.length,
					starts: Uint32Array.from({ length: ids.length + 1 }, (_, k) => k),
					vertices: ids,
					vectors: Float64Array.from({ length: 3 * ids.length }, (_, i) => (i % 3 === 2 ? -1 : 0)),
					slack: Float64Array.from(ids, (v) => level - positions[3 * v + 2] - clearance),
					values: Float64Array.from(ids, (v) => level - positions[3 * v + 2])
				};
			}
		})
	};
}

const surface = ellipsoid(4, [2.4, 0.9, 0.7]);
const box = makeBox({
	centre: [0, 0, 0.4],
	halfSize: [1.5, 0.8, 0.45],
	lattice: [5, 4, 4],
	held: { u0: 1, u1: 1, v0: 1, v1: 1, w0: 1, w1: 0 }
});
const upward = (s: Surface): MoveObjective => ({
	id: 'lift',
	sense: 'minimise',
	weight: 1,
	// Falls where the surface goes outward, most of all in the middle of its top.
	gradient: s.normals.map((n, i) => {
		const v = Math.floor(i / 3);
		return -n * s.mass[v] * (2 - s.positions[3 * v] ** 2) * (1 + s.positions[3 * v + 2]);
	})
});
const prepared = prepareMove(surface, [box], { smoothing: 0.05 });
const gain = (constraints: MoveConstraint[], step = 0.05) =>
	prepared.solve({ objectives: [upward(surface)], step, constraints });

describe('constraints at places', () => {
	it('touch a ceiling and never cross it', () => {
		const free = gain([]);
		const keepOut: MoveConstraint = {
			kind: 'keepOut',
			label: 'roof rail',
			limit: 0.002,
			source: ceiling(0.722, 0.002)
		};
		const kept = gain([keepOut]);
		const top = (s: typeof free) => {
			let most = -Infinity;
			s.moved.forEach((v, i) => (most = Math.max(most, surface.positions[3 * v + 2] + s.displacement[3 * i + 2])));
			return most;
		};
		expect(top(free)).toBeGreaterThan(0.72);
		expect(top(kept)).toBeLessThanOrEqual(0.72);
		expect(top(kept)).toBeGreaterThan(0.72 - 1e-5);
		const [report] = kept.constraints;
		expect(report).toMatchObject({ kind: 'keepOut', active: true, kept: true });
		expect(report.after).toBeGreaterThanOrEqual(0.002);
		expect(report.places).toBeGreaterThan(0);
		expect(report.price).toBeGreaterThan(0);
		expect(kept.maxDisplacement).toBeCloseTo(0.05, 9);
	});

	it('bound displacement inward and outward', () => {
		const bounded = gain(
			[
				{ kind: 'displacement', inward: 0.001, outward: 0.02 },
				{ kind: 'volume', bound: 'hold' }
			],
			0.04
		);
		const along = Array.from(bounded.moved, (v, i) =>
			[0, 1, 2].reduce((s, d) => s + bounded.displacement[3 * i + d] * surface.normals[3 * v + d], 0)
		);
		expect(Math.min(...along)).toBeGreaterThanOrEqual(-0.001 - 1e-12);
		expect(Math.max(...along)).toBeLessThanOrEqual(0.02 + 1e-12);
		expect(bounded.constraints.map((c) => [c.kind, c.bound, c.kept])).toEqual([
			['displacement', 'atLeast', true],
			['displacement', 'atMost', true],
			['volume', 'hold', true]
		]);
	});

	it('price what a little relaxation gains at the same length of the move in the metric', () => {
		const at = (clearance: number, step: number) =>
			gain([{ kind: 'keepOut', label: 'roof rail', limit: clearance, source: ceiling(0.722, clearance) }], step);
		const before = at(0.002, 0.05);
		const relaxation = 2e-5;
		// The step whose move has the length of the first.
		let [low, high] = [0.049, 0.051];
		for (let k = 0; k < 40; k++) {
			const middle = 0.5 * (low + high);
			if (at(0.002 - relaxation, middle).metricLength < before.metricLength) low = middle;
			else high = middle;
		}
		const after = at(0.002 - relaxation, 0.5 * (low + high));
		const gained = before.predictedWeighted - after.predictedWeighted;
		const [{ price }] = before.constraints;
		expect(gained / (price * relaxation)).toBeGreaterThan(0.98);
		expect(gained / (price * relaxation)).toBeLessThan(1.02);
	});

	it('name the constraints of a conflict', () => {
		expect(() =>
			gain([
				{ kind: 'keepOut', label: 'roof rail', limit: 0, source: ceiling(0.69, 0) },
				{ kind: 'displacement', inward: 0.001 }
			])
		).toThrow(/"roof rail".*"displacement inward"|"displacement inward".*"roof rail"/);
	});

	it('say that a step cannot be reached, and what stops it', () => {
		expect(() => gain([{ kind: 'displacement', inward: 0.001, outward: 0.001 }])).toThrow(
			/step of 0\.05 m cannot be reached.*displacement outward/
		);
	});
});

describe('volumes of parts', () => {
	it('are held exactly beside that of the whole, while a free one changes', () => {
		const front: number[] = [];
		for (let t = 0; t < surface.triangles.length / 3; t++) {
			const x = [0, 1, 2].reduce((sum, k) => sum + surface.positions[3 * surface.triangles[3 * t + k]], 0);
			if (x > 0.3) front.push(t);
		}
		const part = Uint32Array.from(front);
		const after = ({ moved, displacement }: ReturnType<typeof gain>) => {
			const { positions, triangles } = patchVolume(surface.positions, surface.triangles, part);
			moved.forEach((v, i) => {
				for (let d = 0; d < 3; d++) positions[3 * v + d] += displacement[3 * i + d];
			});
			return volumeOf(positions, triangles);
		};
		const before = patchVolume(surface.positions, surface.triangles, part).volume;
		const whole: MoveConstraint = { kind: 'volume', bound: 'hold' };
		const free = gain([whole]);
		expect(Math.abs(after(free) / before - 1)).toBeGreaterThan(1e-5);
		const held = gain([whole, { kind: 'volume', bound: 'hold', part }]);
		expect(Math.abs(after(held) / before - 1)).toBeLessThan(1e-12);
		expect(Math.abs(held.volumeAfter / held.volumeBefore - 1)).toBeLessThan(1e-12);
		expect(held.constraints.map((c) => [c.kept, c.active])).toEqual([
			[true, true],
			[true, true]
		]);
		expect(held.constraints[1].before).toBeCloseTo(before, 12);
		expect(held.predictedWeighted).toBeGreaterThan(free.predictedWeighted);
	});
});

describe('symmetry', () => {
	const plane = { point: [0, 0, 0] as [number, number, number], normal: [0, 1, 0] as [number, number, number] };
	const gradient = smoothGradient(surface);
	const objective: MoveObjective = { id: 'one', sense: 'minimise', weight: 1, gradient };
	const key = (x: number, y: number, z: number) => `${x.toFixed(9)} ${y.toFixed(9)} ${z.toFixed(9)}`;
	const index = new Map<string, number>();
	for (let v = 0; v < surface.mass.length; v++) {
		index.set(key(surface.positions[3 * v], surface.positions[3 * v + 1] + 0, surface.positions[3 * v + 2]), v);
	}
	const worstAsymmetry = (moved: Uint32Array, displacement: Float64Array) => {
		const slot = new Map(Array.from(moved, (v, i) => [v, i]));
		let worst = 0;
		let pairs = 0;
		moved.forEach((v, i) => {
			const [x, y, z] = surface.positions.subarray(3 * v, 3 * v + 3);
			const partner = index.get(key(x, 0 - y, z)) ?? index.get(key(x, -y, z));
			const j = partner === undefined ? undefined : slot.get(partner);
			if (j === undefined) return;
			pairs++;
			for (let d = 0; d < 3; d++) {
				const sign = d === 1 ? -1 : 1;
				worst = Math.max(worst, Math.abs(displacement[3 * i + d] - sign * displacement[3 * j + d]));
			}
		});
		return { worst, pairs };
	};
	const cases: [string, Parameters<typeof makeBox>[0][]][] = [
		['a box across the plane', [{ centre: [0, 0, 0.4], halfSize: [1.5, 0.8, 0.45], lattice: [5, 5, 4] }]],
		['a box on one side', [{ centre: [0, 0.5, 0], halfSize: [1.5, 0.45, 0.8], lattice: [4, 4, 4] }]],
		['a box that reaches over the plane', [{ centre: [0.2, 0.3, 0.3], halfSize: [1.2, 0.5, 0.5], lattice: [4, 3, 4] }]],
		[
			'two boxes that mirror each other',
			[
				{ id: 'left', centre: [0, 0.5, 0], halfSize: [1.5, 0.45, 0.8], lattice: [4, 4, 4] },
				{ id: 'right', centre: [0, -0.5, 0], halfSize: [1.5, 0.45, 0.8], lattice: [4, 4, 4] }
			]
		],
		[
			'a turned box on one side',
			[
				{
					centre: [0.3, 0.5, 0],
					halfSize: [1.2, 0.4, 0.6],
					lattice: [4, 3, 4],
					rotation: [0, 0, Math.sin(0.2), Math.cos(0.2)]
				}
			]
		]
	];
	it.each(cases)('mirrors the move of %s', (_, boxes) => {
		const held = { u0: 1, u1: 1, v0: 0, v1: 0, w0: 0, w1: 0 };
		const move = prepareMove(
			surface,
			boxes.map((b) => makeBox({ held, ...b })),
			{ smoothing: 0.05, symmetry: plane }
		).solve({ objectives: [objective], step: 0.02, constraints: [{ kind: 'volume', bound: 'hold' }] });
		const { worst, pairs } = worstAsymmetry(move.moved, move.displacement);
		expect(pairs).toBeGreaterThan(0.95 * move.moved.length);
		expect(worst).toBeLessThan(1e-11);
		expect(move.predictedWeighted).toBeLessThan(0);
		expect(move.constraints[0].kept).toBe(true);
		move.moved.forEach((v, i) => {
			if (surface.positions[3 * v + 1] === 0) expect(move.displacement[3 * i + 1]).toBe(0);
		});
	});

	it('moves a half model as it moves the whole', () => {
		const { half, whole } = halfAndWhole();
		expect(half.watertight).toBe(true);
		expect(half.volume).toBeCloseTo(whole.volume / 2, 12);
		expect(volumeOf(half.positions, half.triangles, half.origin)).toBe(half.volume);
		const across = makeBox({ centre: [0, 0, 0.4], halfSize: [1.5, 0.9, 0.45], lattice: [4, 5, 4] });
		const solve = (s: Surface) =>
			prepareMove(s, [across], { smoothing: 0.05, symmetry: plane }).solve({
				objectives: [upward(s)],
				step: 0.02,
				constraints: [{ kind: 'volume', bound: 'hold' }]
			});
		const a = solve(whole);
		const b = solve(half);
		expect(b.constraints[0].kept).toBe(true);
		const slot = new Map(Array.from(a.moved, (v, i) => [v, i]));
		let worst = 0;
		b.moved.forEach((v, i) => {
			const j = slot.get(v)!;
			for (let d = 0; d < 3; d++)
				worst = Math.max(worst, Math.abs(a.displacement[3 * j + d] - b.displacement[3 * i + d]));
			if (half.positions[3 * v + 1] === 0) expect(b.displacement[3 * i + 1]).toBe(0);
		});
		// The cut edge's normals see one side only, which changes the metric there a little.
		expect(worst).toBeLessThan(0.02 * 0.02);
	});
});

/** A body of revolution about x cut at y = 0, and the whole of it, whose first vertices are the half's. */
function halfAndWhole(): { half: Surface; whole: Surface } {
	const full = revolution(40, 32, (t) => [-2 * Math.cos(Math.PI * t), 0.7 * Math.sin(Math.PI * t)]);
	const positions = full.positions.map((x) => (Math.abs(x) < 1e-12 ? 0 : x));
	const kept: number[] = [];
	for (let t = 0; t < full.triangles.length; t += 3) {
		const ids = full.triangles.subarray(t, t + 3);
		if (ids.every((v) => positions[3 * v + 1] >= 0)) kept.push(...ids);
	}
	const used = [...new Set(kept)].sort((p, q) => p - q);
	const renamed = new Map(used.map((v, i) => [v, i]));
	const own = Float64Array.from(used.flatMap((v) => Array.from(positions.subarray(3 * v, 3 * v + 3))));
	const triangles = kept.map((v) => renamed.get(v)!);
	const mirrored = new Map<number, number>();
	const more: number[] = [];
	used.forEach((_, i) => {
		if (own[3 * i + 1] === 0) return mirrored.set(i, i);
		mirrored.set(i, used.length + more.length / 3);
		more.push(own[3 * i], -own[3 * i + 1], own[3 * i + 2]);
	});
	const other: number[] = [];
	for (let t = 0; t < triangles.length; t += 3) {
		other.push(...[triangles[t], triangles[t + 2], triangles[t + 1]].map((v) => mirrored.get(v)!));
	}
	return {
		half: makeSurface(own, Uint32Array.from(triangles), {
			symmetry: { point: [0, 0, 0], normal: [0, 1, 0] }
		}),
		whole: makeSurface(Float64Array.from([...own, ...more]), Uint32Array.from([...triangles, ...other]))
	};
}
