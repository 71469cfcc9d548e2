import { describe, expect, it } from 'vitest';
import {
	MorphError,
	checkBox,
	lockWeights,
	makeSurface,
	matchMap,
	nodalGradient,
	patchVolume,
	prepareKeepOut,
	prepareMove,
	prepareThickness,
	readMapCsv,
	readStl,
	rehearse,
	type DesignBox,
	type MorphErrorCode,
	type MorphPlace,
	type MoveConstraint,
	type MoveObjective,
	type MoveRequest,
	type PrepareOptions
} from '../../../src/lib/morph';
import { workloadStl } from '../../../bench/workload';
import { ellipsoid, icosphere, makeBox, revolution, smoothGradient } from '../../unit/morph/shapes';

/** Codes of file formats have their tests with these (tests/unit/formats). */
type EngineCode = Exclude<MorphErrorCode, `file-${string}`>;

const surface = ellipsoid(3, [1.2, 0.9, 0.7]);
const gradient = smoothGradient(surface);
const drag: MoveObjective = { id: 'drag', gradient, sense: 'minimise', weight: 1 };
const box = makeBox({ centre: [0.6, 0, 0], halfSize: [0.8, 1, 0.8], name: 'nose' });
const bytes = (text: string) => new TextEncoder().encode(text);
const prepare = (boxes: Partial<DesignBox>[] = [{}], options: Partial<PrepareOptions> = {}) =>
	prepareMove(
		surface,
		boxes.map((b) => ({ ...box, ...b })),
		{ smoothing: 0.1, ...options }
	);
const solve = (request: Partial<MoveRequest> = {}, prepared = prepare()) =>
	prepared.solve({ objectives: [drag], step: 0.01, constraints: [], ...request });
const constrained = (...constraints: MoveConstraint[]) => solve({ constraints });
const tetrahedron = {
	positions: Float64Array.of(0, 0, 0, 1, 0, 0, 0, 1, 0, 0, 0, 1),
	open: Uint32Array.of(0, 2, 1, 0, 1, 3, 0, 3, 2)
};
const binary = (change: (view: DataView) => void, length?: number) => {
	const whole = workloadStl(1).slice(0, length);
	change(new DataView(whole.buffer));
	return whole;
};

/** A way to meet every code, and the place that it must name. */
const REFUSALS: Record<EngineCode, [() => unknown, MorphPlace?]> = {
	'stl-empty': [() => readStl(new Uint8Array(0)), { byte: 0 }],
	'stl-truncated': [() => readStl(binary(() => {}, 400)), { byte: 400, triangle: 6 }],
	'stl-not-stl': [() => readStl(bytes('no surface at all '.repeat(20)))],
	'stl-syntax': [
		() =>
			readStl(
				bytes('solid a\nfacet normal 0 0 1\nouter loop\nvertex 0 0 zero\nendloop\nendfacet\nendsolid a\n'.padEnd(200))
			),
		{ line: 4 }
	],
	'stl-non-finite': [() => readStl(binary((view) => view.setFloat32(84 + 50 * 7 + 16, NaN, true))), { triangle: 7 }],
	'csv-empty': [() => readMapCsv(bytes('# nothing\n\n'))],
	'csv-syntax': [() => readMapCsv(bytes('x,y,z,sensitivity\n1,2,3,4\n1,2,3\n')), { line: 3, row: 2 }],
	'csv-non-finite': [() => readMapCsv(bytes('1,2,3,4\n1,2,3,nan\n')), { line: 2, row: 2 }],
	'map-shape': [
		() =>
			nodalGradient({ kind: 'density', location: 'vertex', values: new Float64Array(5), outward: 'raises' }, surface)
	],
	'map-unmatched': [
		() =>
			matchMap(
				{ points: Float64Array.of(50, 50, 50), values: Float64Array.of(1), components: 1 },
				{ positions: Float32Array.from(surface.positions), triangles: surface.triangles },
				{ location: 'vertex', kind: 'density' }
			)
	],
	'mesh-shape': [
		() => makeSurface(tetrahedron.positions, Uint32Array.of(0, 1, 2, 0, 1, 7)),
		{ triangle: 1, vertex: 7 }
	],
	'mesh-non-finite': [() => makeSurface(tetrahedron.positions.with(4, Infinity), tetrahedron.open), { vertex: 1 }],
	'mesh-open': [
		() => {
			const shell = makeSurface(tetrahedron.positions, tetrahedron.open);
			prepareMove(shell, [makeBox({ lattice: [2, 2, 2] })], { smoothing: 0.1 }).solve({
				objectives: [{ ...drag, gradient: Float64Array.from({ length: 12 }, (_, i) => i) }],
				step: 0.01,
				constraints: [{ kind: 'volume', bound: 'hold' }]
			});
		},
		{ constraint: 0 }
	],
	'box-invalid': [() => prepare([{ halfSize: [1, -1, 1] }]), { box: 'nose' }],
	'box-empty': [() => prepare([{}, { centre: [9, 9, 9], name: 'far' }]), { box: 'far' }],
	'no-free-points': [() => prepare([{ held: { u0: 2, u1: 2, v0: 0, v1: 0, w0: 0, w1: 0 } }]), { box: 'nose' }],
	'metric-singular': [() => prepare([{ halfSize: [0.2, 0.2, 0.2], centre: [1.2, 0, 0] }], { eps: 0 }), { box: 'nose' }],
	'gradient-zero': [() => solve({ objectives: [{ ...drag, gradient: new Float64Array(gradient.length) }] })],
	'gradient-missing': [() => solve({ objectives: [{ ...drag, sense: 'hold' }] })],
	'step-invalid': [() => solve({ step: 0 })],
	'smoothing-invalid': [() => prepare([{}], { smoothing: -1 })],
	'constraint-invalid': [() => constrained({ kind: 'volume', bound: 'hold', value: NaN }), { constraint: 0 }],
	'constraint-conflict': [() => constrained({ kind: 'volume', bound: 'atLeast', value: 2 * surface.volume })],
	'step-unreachable': [
		() => {
			// Upward only, on the top: nothing can slide along the surface.
			const top = prepare([{ centre: [0, 0, 0.6], halfSize: [0.4, 0.4, 0.3], lattice: [3, 3, 3], axes: ['z'] }]);
			solve({ constraints: [{ kind: 'displacement', inward: 1e-4, outward: 1e-4 }] }, top);
		}
	],
	'symmetry-invalid': [() => prepare([{}], { symmetry: { point: [0, 0, 0], normal: [0, 2, 0] } })],
	'hand-invalid': [() => prepare().applyByHand([new Float64Array(5)], [drag]), { box: 'nose' }],
	'keep-out-invalid': [() => prepareKeepOut({ kind: 'halfSpace', point: [0, 0, 0], normal: [0, 0, 0] }, 'outside', 0)],
	'keep-out-open': [
		() => prepareKeepOut({ kind: 'mesh', positions: tetrahedron.positions, triangles: tetrahedron.open }, 'outside', 0),
		{}
	],
	'thickness-invalid': [() => prepareThickness(surface, 0)],
	'lock-invalid': [
		() => lockWeights(surface.positions, surface.triangles, [{ triangles: Uint32Array.of(99999), blend: 0 }]),
		{ triangle: 99999 }
	],
	'part-invalid': [() => patchVolume(surface.positions, surface.triangles, Uint32Array.of())],
	'rehearsal-invalid': [
		() => rehearse(surface.positions, surface.triangles, { kind: 'frontalArea', direction: [0, 0, 0] })
	],
	unsupported: [() => constrained({ kind: 'colour' } as unknown as MoveConstraint), { constraint: 0 }]
};

const refusal = (work: () => unknown): MorphError => {
	try {
		work();
	} catch (error) {
		if (error instanceof MorphError) return error;
		throw error;
	}
	throw new Error('nothing was refused');
};

describe('refusals', () => {
	it.each(Object.entries(REFUSALS))('%s: says what is wrong, where, and what mends it', (code, [work, place]) => {
		const error = refusal(work);
		expect(error.code).toBe(code);
		expect(error.message.length).toBeGreaterThan(15);
		expect(error.mend.length).toBeGreaterThan(10);
		if (place) expect(error.place ?? {}).toMatchObject(place);
	});

	const faults: [string, Partial<DesignBox>, RegExp][] = [
		['a centre that is no number', { centre: [NaN, 0, 0] }, /finite/],
		['a flat box', { halfSize: [1, 1, 0] }, /half-size/],
		['a rotation of the wrong length', { rotation: [0, 0, 0, 2] }, /rotation has length/],
		['too few points', { lattice: [1, 4, 4] }, /1 x 4 x 4/],
		['half a point', { lattice: [4, 4.5, 4] }, /4 x 4.5 x 4/],
		['too many points', { lattice: [21, 4, 4] }, /21 x 4 x 4/],
		['too many in all', { lattice: [20, 20, 20] }, /more than 4000/],
		['an unknown basis', { basis: 'cubic' as 'bernstein' }, /"cubic"/],
		['a degree that is none', { basis: 'bspline', degree: 4 }, /degree 4/],
		['a degree above the points', { basis: 'bspline', degree: 3, lattice: [3, 4, 4] }, /more points/],
		['too many held planes', { held: { ...box.held, v1: 4 } }, /face v1/],
		['a held point outside', { heldPoints: [3, 64] }, /held point 64/],
		['an axis twice', { axes: ['x', 'x'] }, /x, x/],
		['an unknown frame', { frame: 'body' as 'box' }, /frame/]
	];
	it.each(faults)('of a box name the fault: %s', (_, more, message) => {
		const error = refusal(() => checkBox({ ...box, ...more }));
		expect(error.code).toBe('box-invalid');
		expect(error.message).toMatch(message);
		expect(error.place).toEqual({ box: 'nose' });
	});

	it.each([3e-3, 1e-3, 3e-4, 1e-4])(
		'say that a step is out of reach where places outnumber the unknowns: %f m',
		(bound) => {
			const top = prepare([{ centre: [0, 0, 0.6], halfSize: [0.4, 0.4, 0.3], lattice: [3, 3, 3], axes: ['z'] }]);
			const constraints: MoveConstraint[] = [{ kind: 'displacement', inward: bound, outward: bound }];
			const error = refusal(() => solve({ constraints }, top));
			expect(error.code).toBe('step-unreachable');
			// The length that can be had is near the bound: the surface there faces upward, or nearly.
			const length = Number(/more than ([\d.e-]+) m/.exec(error.message)?.[1]);
			expect(length / bound).toBeGreaterThan(1);
			expect(length / bound).toBeLessThan(1.2);
		}
	);

	it('leave nothing behind: the same prepared move solves afterwards as before', () => {
		const prepared = prepare();
		const before = solve({}, prepared).displacement;
		refusal(() => solve({ step: -1 }, prepared));
		refusal(() => solve({ constraints: [{ kind: 'volume', bound: 'atMost', value: 0 }] }, prepared));
		refusal(() => solve({ objectives: [drag, drag] }, prepared));
		expect(solve({}, prepared).displacement).toEqual(before);
	});

	it('name the vertex of a gradient that is not finite, and the objective', () => {
		const bad = gradient.slice();
		bad[3 * 17 + 1] = NaN;
		expect(refusal(() => solve({ objectives: [{ ...drag, gradient: bad }] })).place).toEqual({
			objective: 'drag',
			vertex: 17
		});
		expect(refusal(() => constrained({ kind: 'objective', objectiveId: 'lift', bound: 'hold' })).place).toEqual({
			constraint: 0,
			objective: 'lift'
		});
	});

	it('come from a cancelled job as what was thrown, and change nothing', () => {
		class Cancelled extends Error {}
		const work = () =>
			prepareMove(surface, [box], {
				smoothing: 0.1,
				checkpoint: () => {
					throw new Cancelled();
				}
			});
		const kept = surface.positions.slice();
		expect(work).toThrow(Cancelled);
		expect(surface.positions).toEqual(kept);
	});

	it('are not for whole and good input', () => {
		const { positions, triangles } = icosphere(2);
		expect(makeSurface(positions, triangles).watertight).toBe(true);
		const body = revolution(10, 12, (t) => [-Math.cos(Math.PI * t), Math.sin(Math.PI * t)]);
		expect(makeSurface(body.positions, body.triangles).watertight).toBe(true);
		expect(solve().predictedWeighted).toBeLessThan(0);
	});
});
