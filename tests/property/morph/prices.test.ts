import { describe, expect, it } from 'vitest';
import { prepareMove, type Bound, type MoveConstraint, type MoveObjective } from '../../../src/lib/morph';
import { ellipsoid, makeBox, smoothGradient } from '../../unit/morph/shapes';

const surface = ellipsoid(4, [2.4, 0.9, 0.7]);
const box = makeBox({
	centre: [1.3, 0, 0.1],
	halfSize: [1.2, 1, 0.9],
	lattice: [5, 4, 4],
	held: { u0: 2, u1: 0, v0: 0, v1: 0, w0: 0, w1: 0 }
});
const prepared = prepareMove(surface, [box], { smoothing: 0.05 });
const objectives: MoveObjective[] = [
	// Growing costs, so that the volume has a price that matters.
	{
		id: 'drag',
		gradient: smoothGradient(surface).map((g, i) => g + 0.3 * surface.volumeGradient[i]),
		sense: 'minimise',
		weight: 2
	},
	{ id: 'lift', gradient: smoothGradient(surface, 5), sense: 'hold', weight: 1 }
];
const solve = (constraints: MoveConstraint[], step: number) => prepared.solve({ objectives, step, constraints });

/**
 * Gain of the weighted objective by moving one bound a little, at the same length of the move in the metric: what a Lagrange
 * multiplier is, by differences.
 */
function gained(at: (change: number) => MoveConstraint[], change: number, step: number): number {
	const before = solve(at(0), step);
	let [low, high] = [0.8 * step, 1.25 * step];
	for (let k = 0; k < 50; k++) {
		const middle = 0.5 * (low + high);
		if (solve(at(change), middle).metricLength < before.metricLength) low = middle;
		else high = middle;
	}
	const after = solve(at(change), 0.5 * (low + high));
	expect(Math.abs(after.metricLength / before.metricLength - 1)).toBeLessThan(1e-9);
	return before.predictedWeighted - after.predictedWeighted;
}

describe('prices', () => {
	const step = 0.003;
	const volume = (bound: Bound, by: number): MoveConstraint => ({ kind: 'volume', bound, value: surface.volume + by });
	const lift = (bound: Bound, value: number): MoveConstraint => ({
		kind: 'objective',
		objectiveId: 'lift',
		bound,
		value
	});
	const free = solve([], step);
	const grows = free.volumeAfter > free.volumeBefore;
	const rises = free.predicted[1].change > 0;

	const cases: [string, (change: number) => MoveConstraint[], number, number][] = [
		['a held volume', (c) => [volume('hold', c)], 0, 1e-6],
		['a held objective', (c) => [lift('hold', c)], 0, 1e-6],
		['a held volume beside a held objective', (c) => [volume('hold', c), lift('hold', 0)], 0, 1e-6],
		['a held objective beside a held volume', (c) => [volume('hold', 0), lift('hold', c)], 1, 1e-6],
		['a bounded volume', (c) => [volume(grows ? 'atMost' : 'atLeast', grows ? c : -c)], 0, 1e-6],
		['a bounded objective', (c) => [lift(rises ? 'atMost' : 'atLeast', rises ? c : -c)], 0, 1e-6]
	];
	it.each(cases)('of %s: what raising (relaxing) it gains, within 2 %', (name, at, index, change) => {
		const report = solve(at(0), step).constraints[index];
		expect(report.active).toBe(true);
		expect(Math.abs(report.price)).toBeGreaterThan(0);
		if (name.includes('bounded')) expect(report.price).toBeGreaterThan(0);
		const ratio = gained(at, change, step) / (report.price * change);
		expect(ratio).toBeGreaterThan(0.98);
		expect(ratio).toBeLessThan(1.02);
	});

	it('double with the weight of the objective that pays', () => {
		const doubled = prepared.solve({
			objectives: [{ ...objectives[0], weight: 4 }, objectives[1]],
			step,
			constraints: [volume('hold', 0)]
		});
		const [{ price }] = solve([volume('hold', 0)], step).constraints;
		expect(doubled.constraints[0].price / price).toBeCloseTo(2, 10);
	});

	it('of what does not bind is nothing', () => {
		const [report] = solve([volume(grows ? 'atLeast' : 'atMost', grows ? -1e-3 : 1e-3)], step).constraints;
		expect(report).toMatchObject({ active: false, price: 0, kept: true });
	});
});
