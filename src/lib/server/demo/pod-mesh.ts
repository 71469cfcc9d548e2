/**
 * The pod's surface mesh: the grid of a box's six faces (no poles, so no slivers), thrown onto the implicit surface and evened out,
 * with the feet grown from the floor. One closed manifold surface, mirror-symmetric in y, outward, about 40,000 triangles.
 */
import { POD_CENTRE, podDistance } from './pod';

/** A surface in the study's file unit. Owned by whoever receives it. */
export interface DemoSurface {
	/** Stride 3: x, y, z in millimetres. */
	positions: Float32Array;
	/** Stride 3: vertex numbers, counter-clockwise from outside, grouped by patch. */
	triangles: Uint32Array;
	patches: { name: string; firstTriangle: number; triangleCount: number }[];
}

/** Cells of the box along x, y, z; y even, so that the mirror plane is a grid line. */
const CELLS: readonly [number, number, number] = [126, 48, 22];
const HALF_EXTENT: readonly [number, number, number] = [1.1, 0.45, 0.17];
const RELAXATIONS = 100;
/** Under 1/2, or the evening out of lengths overshoots and zigzags. */
const RELAXATION = 0.35;
/** Between projections the points drift off the surface by far less than a cell. */
const PROJECT_EVERY = 4;

/** Feet on the floor's grid: first and last cell line in x; in y counted from the mirror plane; cells that the flank takes. */
const FEET = [
	{ i0: 29, i1: 43, j0: 11, j1: 20 },
	{ i0: 82, i1: 96, j0: 11, j1: 20 }
];
const FLANK_CELLS = 3;
const FOOT_HEIGHT = 0.038;

/** Rings of cells before the tail's end that belong to the patch "tail". */
const TAIL_RINGS = 10;

export const PATCH_NAMES = ['shell', 'floor', 'feet', 'tail'] as const;

interface Grid {
	/** Grid coordinates of each vertex, stride 3. */
	lattice: Int16Array;
	/** Vertex numbers, four to a cell, counter-clockwise from outside. */
	quads: Uint32Array;
	/** The vertex mirrored in y. */
	mirror: Uint32Array;
	/** Neighbours along grid lines, stride 4; a cube corner repeats its first. */
	neighbours: Uint32Array;
}

function boxGrid(): Grid {
	const [nx, ny, nz] = CELLS;
	const lattice: number[] = [];
	const numbers = new Map<number, number>();
	const key = (i: number, j: number, k: number) => (i * (ny + 1) + j) * (nz + 1) + k;
	const vertex = (i: number, j: number, k: number) => {
		const at = key(i, j, k);
		let number = numbers.get(at);
		if (number === undefined) {
			number = lattice.length / 3;
			numbers.set(at, number);
			lattice.push(i, j, k);
		}
		return number;
	};
	const quads: number[] = [];
	for (let i = 0; i < nx; i++) {
		for (let j = 0; j < ny; j++) {
			quads.push(vertex(i, j, 0), vertex(i, j + 1, 0), vertex(i + 1, j + 1, 0), vertex(i + 1, j, 0));
			quads.push(vertex(i, j, nz), vertex(i + 1, j, nz), vertex(i + 1, j + 1, nz), vertex(i, j + 1, nz));
		}
		for (let k = 0; k < nz; k++) {
			quads.push(vertex(i, 0, k), vertex(i + 1, 0, k), vertex(i + 1, 0, k + 1), vertex(i, 0, k + 1));
			quads.push(vertex(i, ny, k), vertex(i, ny, k + 1), vertex(i + 1, ny, k + 1), vertex(i + 1, ny, k));
		}
	}
	for (let j = 0; j < ny; j++) {
		for (let k = 0; k < nz; k++) {
			quads.push(vertex(0, j, k), vertex(0, j, k + 1), vertex(0, j + 1, k + 1), vertex(0, j + 1, k));
			quads.push(vertex(nx, j, k), vertex(nx, j + 1, k), vertex(nx, j + 1, k + 1), vertex(nx, j, k + 1));
		}
	}
	const count = lattice.length / 3;
	const mirror = new Uint32Array(count);
	const sets = Array.from({ length: count }, () => new Set<number>());
	for (let v = 0; v < count; v++) {
		mirror[v] = numbers.get(key(lattice[3 * v], ny - lattice[3 * v + 1], lattice[3 * v + 2]))!;
	}
	for (let q = 0; q < quads.length; q += 4) {
		for (let c = 0; c < 4; c++) {
			sets[quads[q + c]].add(quads[q + ((c + 1) % 4)]);
			sets[quads[q + ((c + 1) % 4)]].add(quads[q + c]);
		}
	}
	const neighbours = new Uint32Array(4 * count);
	sets.forEach((set, v) => {
		const list = [...set];
		for (let c = 0; c < 4; c++) neighbours[4 * v + c] = list[c] ?? v;
	});
	return { lattice: Int16Array.from(lattice), quads: Uint32Array.from(quads), mirror, neighbours };
}

/** Moves a point along the surface's normal until it lies on the surface (Newton on the signed distance). */
function project(p: Float64Array, at: number, normal: Float64Array, steps: number): void {
	for (let n = 0; n < steps; n++) {
		const d = podDistance(p[at], p[at + 1], p[at + 2], normal);
		if (Math.abs(d) < 1e-9) return;
		for (let c = 0; c < 3; c++) p[at + c] -= d * normal[c];
	}
}

/** Height of the feet above (below) the floor at each vertex, in metres: a function of the grid, so that patches end on grid lines. */
function footHeights(grid: Grid): Float64Array {
	const half = CELLS[1] / 2;
	const heights = new Float64Array(grid.mirror.length);
	for (let v = 0; v < heights.length; v++) {
		if (grid.lattice[3 * v + 2] !== 0) continue;
		const i = grid.lattice[3 * v];
		const j = Math.abs(grid.lattice[3 * v + 1] - half);
		for (const foot of FEET) {
			const inX = Math.max(0, Math.min(i - foot.i0, foot.i1 - i));
			const inY = Math.max(0, Math.min(j - foot.j0, foot.j1 - j));
			// Distance from the flat top, in cells; round corners.
			const beyond = Math.hypot(Math.max(0, FLANK_CELLS - inX), Math.max(0, FLANK_CELLS - inY));
			const t = Math.max(0, 1 - beyond / FLANK_CELLS);
			if (inX > 0 && inY > 0) heights[v] = FOOT_HEIGHT * t * t * (3 - 2 * t);
		}
	}
	return heights;
}

/** Vertices on the surface, in metres, evened out so that neighbouring edges have similar lengths, the feet's flanks included. */
function layOut(grid: Grid, feet: Float64Array): Float64Array {
	const count = grid.mirror.length;
	let p = new Float64Array(3 * count);
	let next = new Float64Array(3 * count);
	const normal = new Float64Array(3);
	for (let v = 0; v < count; v++) {
		const direction = [0, 1, 2].map((c) => ((2 * grid.lattice[3 * v + c]) / CELLS[c] - 1) * HALF_EXTENT[c]);
		let inside = 0;
		let outside = 4;
		for (let n = 0; n < 40; n++) {
			const s = (inside + outside) / 2;
			const [x, y, z] = direction.map((d, c) => POD_CENTRE[c] + s * d);
			if (podDistance(x, y, z) < 0) inside = s;
			else outside = s;
		}
		for (let c = 0; c < 3; c++) p[3 * v + c] = POD_CENTRE[c] + inside * direction[c];
	}
	for (let n = 0; n < RELAXATIONS; n++) {
		for (let v = 0; v < count; v++) {
			if (grid.mirror[v] < v) continue;
			const sum = [0, 0, 0];
			let weights = 0;
			for (let c = 0; c < 4; c++) {
				const u = grid.neighbours[4 * v + c];
				const dx = p[3 * u] - p[3 * v];
				const dy = p[3 * u + 1] - p[3 * v + 1];
				const dz = p[3 * u + 2] - p[3 * v + 2];
				// Longer edges pull harder, which is what evens them out.
				const weight = Math.sqrt(dx * dx + dy * dy + (dz - feet[u] + feet[v]) ** 2);
				sum[0] += weight * dx;
				sum[1] += weight * dy;
				sum[2] += weight * dz;
				weights += weight;
			}
			for (let c = 0; c < 3; c++) next[3 * v + c] = p[3 * v + c] + (RELAXATION * sum[c]) / weights;
			if (grid.mirror[v] === v) next[3 * v + 1] = 0;
			const last = n + 1 === RELAXATIONS;
			if (last || n % PROJECT_EVERY === 0) project(next, 3 * v, normal, last ? 8 : 1);
			if (grid.mirror[v] === v) next[3 * v + 1] = 0;
			const m = grid.mirror[v];
			next[3 * m] = next[3 * v];
			next[3 * m + 1] = -next[3 * v + 1] + 0;
			next[3 * m + 2] = next[3 * v + 2];
		}
		[p, next] = [next, p];
	}
	return p;
}

function patchOf(grid: Grid, quad: number, feet: Float64Array): number {
	const corners = grid.quads.subarray(4 * quad, 4 * quad + 4);
	const floor = corners.every((v) => grid.lattice[3 * v + 2] === 0);
	if (floor) return corners.some((v) => feet[v] > 0) ? 2 : 1;
	return corners.every((v) => grid.lattice[3 * v] >= CELLS[0] - TAIL_RINGS) ? 3 : 0;
}

/** Builds the pod. Deterministic; about a second. */
export function podSurface(): DemoSurface {
	const grid = boxGrid();
	const feet = footHeights(grid);
	const p = layOut(grid, feet);
	const count = grid.mirror.length;
	const positions = new Float32Array(3 * count);
	for (let v = 0; v < count; v++) {
		positions[3 * v] = 1000 * p[3 * v];
		positions[3 * v + 1] = 1000 * p[3 * v + 1];
		positions[3 * v + 2] = 1000 * (p[3 * v + 2] - feet[v]);
	}
	const squared = (a: number, b: number) =>
		(positions[3 * a] - positions[3 * b]) ** 2 +
		(positions[3 * a + 1] - positions[3 * b + 1]) ** 2 +
		(positions[3 * a + 2] - positions[3 * b + 2]) ** 2;
	const lists: number[][] = PATCH_NAMES.map(() => []);
	for (let q = 0; q < grid.quads.length / 4; q++) {
		const [a, b, c, d] = grid.quads.subarray(4 * q, 4 * q + 4);
		const list = lists[patchOf(grid, q, feet)];
		// The shorter diagonal makes the better angles.
		if (squared(a, c) <= squared(b, d)) list.push(a, b, c, a, c, d);
		else list.push(a, b, d, b, c, d);
	}
	const triangles = new Uint32Array(lists.reduce((sum, list) => sum + list.length, 0));
	const patches: DemoSurface['patches'] = [];
	let first = 0;
	lists.forEach((list, n) => {
		triangles.set(list, first);
		patches.push({ name: PATCH_NAMES[n], firstTriangle: first / 3, triangleCount: list.length / 3 });
		first += list.length;
	});
	return { positions, triangles, patches };
}
