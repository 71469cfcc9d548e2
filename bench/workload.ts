import { writeStl, type DesignBox } from '../src/lib/morph';

/** The standard workload, frozen: an ellipsoid from a subdivided icosahedron, one box, one map. Lengths in metres. */
export const SEMI_AXES = [2.4, 0.9, 0.7] as const;
export const STEP = 0.01;
export const SMOOTHING = 0.05;

export const BOX: DesignBox = {
	id: 'standard',
	centre: [1.3, 0, 0.1],
	halfSize: [1.2, 1.0, 0.9],
	rotation: [0, 0, 0, 1],
	lattice: [7, 7, 7],
	basis: 'bernstein',
	held: { u0: 2, u1: 0, v0: 0, v1: 0, w0: 0, w1: 0 },
	axes: ['x', 'y', 'z'],
	frame: 'box'
};

const T = (1 + Math.sqrt(5)) / 2;
const CORNERS = [
	[-1, T, 0],
	[1, T, 0],
	[-1, -T, 0],
	[1, -T, 0],
	[0, -1, T],
	[0, 1, T],
	[0, -1, -T],
	[0, 1, -T],
	[T, 0, -1],
	[T, 0, 1],
	[-T, 0, -1],
	[-T, 0, 1]
];
const FACES = [
	0, 11, 5, 0, 5, 1, 0, 1, 7, 0, 7, 10, 0, 10, 11, 1, 5, 9, 5, 11, 4, 11, 10, 2, 10, 7, 6, 7, 1, 8, 3, 9, 4, 3, 4, 2, 3,
	2, 6, 3, 6, 8, 3, 8, 9, 4, 9, 5, 2, 4, 11, 6, 2, 10, 8, 6, 7, 9, 8, 1
];

/** Unit sphere by splitting an icosahedron's triangles in four, `level` times. */
export function icosphere(level: number): { positions: Float64Array; triangles: Uint32Array } {
	const size = 10 * 4 ** level + 2;
	const positions = new Float64Array(3 * size);
	CORNERS.forEach((c, i) =>
		positions.set(
			c.map((x) => x / Math.hypot(...c)),
			3 * i
		)
	);
	let count = CORNERS.length;
	let triangles = Uint32Array.from(FACES);
	for (let l = 0; l < level; l++) {
		const faces = triangles.length / 3;
		const middles = new Map<number, number>();
		const middle = (a: number, b: number) => {
			const key = Math.min(a, b) * size + Math.max(a, b);
			let m = middles.get(key);
			if (m === undefined) {
				m = count++;
				let length = 0;
				for (let d = 0; d < 3; d++) {
					const x = positions[3 * a + d] + positions[3 * b + d];
					positions[3 * m + d] = x;
					length += x * x;
				}
				for (let d = 0; d < 3; d++) positions[3 * m + d] /= Math.sqrt(length);
				middles.set(key, m);
			}
			return m;
		};
		const next = new Uint32Array(12 * faces);
		for (let t = 0; t < faces; t++) {
			const [p, q, r] = [triangles[3 * t], triangles[3 * t + 1], triangles[3 * t + 2]];
			const [a, b, c] = [middle(p, q), middle(q, r), middle(r, p)];
			next.set([p, a, c], 3 * t);
			next.set([q, b, a], 3 * (faces + t));
			next.set([r, c, b], 3 * (2 * faces + t));
			next.set([a, b, c], 3 * (3 * faces + t));
		}
		triangles = next;
	}
	return { positions, triangles };
}

/** The workload's binary STL. */
export function workloadStl(level: number): Uint8Array {
	const sphere = icosphere(level);
	const positions = Float32Array.from(sphere.positions, (x, i) => x * SEMI_AXES[i % 3]);
	const triangleCount = sphere.triangles.length / 3;
	return writeStl(
		{ positions, triangles: sphere.triangles, patches: [{ name: '', firstTriangle: 0, triangleCount }] },
		{ encoding: 'binary' }
	);
}

/** The workload's map: density by vertex, objective per metre per square metre. */
export function workloadDensity(positions: Float64Array): Float64Array {
	return Float64Array.from({ length: positions.length / 3 }, (_, v) => {
		const [x, y, z] = [positions[3 * v], positions[3 * v + 1], positions[3 * v + 2]];
		return Math.cos(3 * x) * Math.sin(2 * y + 0.4) + 0.3 * z;
	});
}
