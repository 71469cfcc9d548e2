/** What constraints cost: on the demo's pod, a move with everything against a plain one, as a ratio. */
import {
	makeSurface,
	prepareKeepOut,
	prepareMove,
	prepareThickness,
	toMetres,
	type DesignBox,
	type MoveConstraint,
	type MoveObjective,
	type Surface
} from '../src/lib/morph';
import { density } from '../src/lib/server/demo/maps';
import { demoPlan } from '../src/lib/server/demo/plan';
import { podSurface } from '../src/lib/server/demo/pod-mesh';
import { icosphere } from './workload';

const STEP = 0.004;
const SMOOTHING = 0.025;

const CLEARANCE = 0.002;

/** A rail just above the pod's shoulder, as a closed mesh of 5,120 triangles that the free move runs into. */
function rail({ positions: pod }: Surface) {
	const { positions, triangles } = icosphere(4);
	const half = [0.08, 0.12, 0.02];
	const at = (height: number) => {
		const centre = [0.56, 0, height];
		return { kind: 'mesh' as const, positions: positions.map((x, i) => centre[i % 3] + half[i % 3] * x), triangles };
	};
	const n = pod.length / 3;
	const distance = new Float64Array(n);
	let height = 0.5;
	// Let down until the pod is just beyond the clearance.
	for (let k = 0; k < 4; k++) {
		prepareKeepOut(at(height), 'outside', 0).distance(pod, n, 1, distance, new Float64Array(3 * n));
		height -= distance.reduce((least, d) => Math.min(least, d), Infinity) - CLEARANCE - 0.0003;
	}
	return at(height);
}

/** Medians of both moves, from the boxes to the displacement, seconds. */
export function runCost(repeat: number) {
	const pod = podSurface();
	const surface = makeSurface(toMetres(pod.positions, 1e-3), pod.triangles);
	const gradientOf = (key: 'drag' | 'lift') => {
		const out = new Float64Array(surface.positions.length);
		for (let v = 0; v < surface.mass.length; v++) {
			const at = (a: Float64Array) => [a[3 * v], a[3 * v + 1], a[3 * v + 2]] as const;
			const s = density(key, at(surface.positions), at(surface.normals)) * surface.mass[v];
			for (let d = 0; d < 3; d++) out[3 * v + d] = s * surface.normals[3 * v + d];
		}
		return out;
	};
	const objectives: MoveObjective[] = [
		{ id: 'drag', sense: 'minimise', weight: 1, gradient: gradientOf('drag') },
		{ id: 'lift', sense: 'hold', weight: 0, gradient: gradientOf('lift') }
	];
	const box = (create: (typeof demoPlan.boxes)[number]['create'], id: string): DesignBox => ({
		id,
		rotation: [0, 0, 0, 1],
		basis: 'bernstein',
		axes: ['x', 'y', 'z'],
		frame: 'box',
		...create,
		held: { u0: 0, u1: 0, v0: 0, v1: 0, w0: 0, w1: 0, ...create.held },
		heldPoints: []
	});
	const [tail, shoulder] = demoPlan.boxes.map(({ create, key }) => box(create, key));
	const waist: DesignBox = {
		...shoulder,
		id: 'waist',
		name: 'Waist',
		centre: [0.05, 0, 0.25],
		halfSize: [0.3, 0.5, 0.15]
	};
	const volume: MoveConstraint = { kind: 'volume', bound: 'hold' };
	const seconds = { plain: [] as number[], full: [] as number[] };
	let places = 0;
	for (let k = 0; k < repeat; k++) {
		const clock = performance.now();
		prepareMove(surface, [tail], { smoothing: SMOOTHING }).solve({ objectives, step: STEP, constraints: [volume] });
		const middle = performance.now();
		const solution = prepareMove(surface, [tail, shoulder, waist], { smoothing: SMOOTHING }).solve({
			objectives,
			step: STEP,
			constraints: [
				volume,
				{ kind: 'objective', objectiveId: 'lift', bound: 'hold' },
				{
					kind: 'keepOut',
					label: 'rail',
					limit: CLEARANCE,
					source: prepareKeepOut(rail(surface), 'outside', CLEARANCE)
				},
				{ kind: 'thickness', label: 'wall', limit: 0.02, source: prepareThickness(surface, 0.02) }
			]
		});
		seconds.plain.push((middle - clock) / 1000);
		seconds.full.push((performance.now() - middle) / 1000);
		places = solution.constraints.reduce((sum, c) => sum + (c.places ?? 0), 0);
	}
	const median = (list: number[]) => list.sort((a, b) => a - b)[list.length >> 1];
	const [plain, full] = [median(seconds.plain), median(seconds.full)];
	return { plain_seconds: plain, constrained_seconds: full, ratio: full / plain, binding_places: places };
}
