import { describe, expect, it } from 'vitest';
import {
	applyDisplacement,
	makeSurface,
	prepareMove,
	rehearse,
	volumeGradient,
	volumeOf,
	type DesignBox,
	type RehearsalSpec
} from '../../../src/lib/morph';
import { BoxOperator } from '../../../src/lib/morph/operator';
import { VolumeChange } from '../../../src/lib/morph/volume-change';
import { sequence, taylorOrders } from '../../factories/numbers';
import { ellipsoid } from '../../factories/surfaces';
import { makeBox, turn } from '../../unit/morph/shapes';

const STEPS = [4e-3, 2e-3, 1e-3, 5e-4];
const near2 = (orders: number[]) => {
	expect(orders).toHaveLength(STEPS.length - 1);
	for (const order of orders) expect(Math.abs(order - 2)).toBeLessThan(0.05);
};

describe('the volume', () => {
	const mesh = ellipsoid(3, [1.4, 0.8, 0.6]);
	const next = sequence(7);
	const positions = mesh.positions.map((x) => x + 0.03 * next());
	const direction = positions.map(() => next());

	it('has the exact gradient about any origin: Taylor remainders of the order 2', () => {
		for (const origin of [
			[0, 0, 0],
			[3, -1, 2]
		] as [number, number, number][]) {
			near2(
				taylorOrders(
					(x) => volumeOf(x, mesh.triangles, origin),
					positions,
					volumeGradient(positions, mesh.triangles, origin),
					direction,
					STEPS
				)
			);
		}
	});

	it('changes as the cubic that is formed for its restoration', () => {
		const surface = makeSurface(positions, mesh.triangles);
		const moved = Uint32Array.from({ length: positions.length / 6 }, (_, i) => 2 * i);
		const [d, e] = [0.1, 0.3].map((s) => Float64Array.from({ length: 3 * moved.length }, () => s * next()));
		const [c0, c1, c2, c3] = new VolumeChange(surface, moved).cubic(d, e);
		for (const t of [-1, 0, 0.4, 2]) {
			const all = d.map((x, i) => x + t * e[i]);
			const exact = volumeOf(applyDisplacement(positions, moved, all), mesh.triangles) - surface.volume;
			expect(c0 + t * (c1 + t * (c2 + t * c3))).toBeCloseTo(exact, 12);
		}
	});
});

describe("the gradient by the control points, B'W g", () => {
	const mesh = ellipsoid(3, [1.4, 0.8, 0.6]);
	const next = sequence(11);
	const weights = Float64Array.from({ length: mesh.positions.length / 3 }, () => 0.5 + 0.5 * next());
	const boxes: [string, Partial<DesignBox>, 'direct' | 'moments'][] = [
		['Bernstein, straight sums', {}, 'direct'],
		['Bernstein, by cells', {}, 'moments'],
		['Bernstein, turned, by cells', { rotation: turn([1, 2, 3], 0.7) }, 'moments'],
		['B-spline, turned', { basis: 'bspline', degree: 2, rotation: turn([1, 2, 3], 0.7) }, 'direct']
	];
	const specs: RehearsalSpec[] = [{ kind: 'wettedArea' }, { kind: 'volume' }, { kind: 'impactDrag' }];
	const cases = boxes.flatMap(([name, more, path]) =>
		specs.map((spec) => ({ name, more, path, spec, kind: spec.kind }))
	);

	it.each(cases)('$name, $kind: Taylor remainders of the order 2', ({ more, path, spec }) => {
		const box = makeBox({ centre: [0.6, 0.1, 0], halfSize: [1, 0.9, 0.8], lattice: [4, 3, 5], ...more });
		const operator = new BoxOperator(box, mesh, weights, path);
		expect(operator.path).toBe(path);
		const surface = (lattice: Float64Array) =>
			applyDisplacement(mesh.positions, operator.inside, operator.evaluate(lattice));
		const rest = new Float64Array(3 * operator.pointCount);
		const { gradient } = rehearse(mesh.positions, mesh.triangles, spec);
		near2(
			taylorOrders(
				(lattice) => rehearse(surface(lattice), mesh.triangles, spec).value,
				rest,
				operator.project(gradient),
				rest.map(() => next()),
				STEPS
			)
		);
	});

	it('a hand-made move predicts what the first order is', () => {
		const surface = makeSurface(mesh.positions, mesh.triangles);
		const box = makeBox({ centre: [0.6, 0.1, 0], halfSize: [1, 0.9, 0.8], lattice: [4, 3, 5] });
		const prepared = prepareMove(surface, [box], { smoothing: 0.05 });
		const { value, gradient } = rehearse(mesh.positions, mesh.triangles, { kind: 'wettedArea' });
		const shape = Float64Array.from({ length: 3 * 60 }, () => next());
		const rest = [0.02, 0.01].map((size) => {
			const move = prepared.applyByHand(
				[shape.map((x) => size * x)],
				[{ id: 'area', gradient, sense: 'minimise', weight: 1 }]
			);
			const child = applyDisplacement(mesh.positions, move.moved, move.displacement);
			const found = rehearse(child, mesh.triangles, { kind: 'wettedArea' }).value - value;
			return Math.abs(found - move.predicted[0].change);
		});
		expect(Math.abs(Math.log2(rest[0] / rest[1]) - 2)).toBeLessThan(0.2);
	});
});
