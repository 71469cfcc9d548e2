import { MorphError } from './errors';

/** Symmetric sparse matrix by rows: row i has the entries starts[i] .. starts[i + 1]. */
export interface SparseMatrix {
	size: number;
	starts: Uint32Array;
	columns: Uint32Array;
	values: Float64Array;
	/** size */
	diagonal: Float64Array;
}

/**
 * M + r^2 L with the lumped mass M and the cotangent Laplacian L (Pinkall and Polthier 1993): x'Lx is the Dirichlet energy
 * of the piecewise linear function x, so L is positive semidefinite on any mesh. Triangles without area have none.
 *
 * @param positions N x 3
 * @param triangles F x 3; only those with all corners in the set count
 * @param slot N: index of each vertex in the set, -1 outside
 * @param mass of the set's vertices
 */
export function helmholtz(
	positions: Float64Array,
	triangles: Uint32Array,
	slot: Int32Array,
	mass: Float64Array,
	radius: number
): SparseMatrix {
	const size = mass.length;
	// Room for every corner's two neighbours, then merged row by row.
	const room = new Uint32Array(size + 1);
	for (let i = 0; i < triangles.length; i += 3) {
		const [a, b, c] = [slot[triangles[i]], slot[triangles[i + 1]], slot[triangles[i + 2]]];
		if (a < 0 || b < 0 || c < 0) continue;
		room[a + 1] += 2;
		room[b + 1] += 2;
		room[c + 1] += 2;
	}
	for (let i = 0; i < size; i++) room[i + 1] += room[i];
	const fill = room.slice(0, size);
	const columns = new Uint32Array(room[size]);
	const values = new Float64Array(room[size]);
	const diagonal = Float64Array.from(mass);
	const square = radius * radius;
	const put = (i: number, j: number, weight: number) => {
		columns[fill[i]] = j;
		values[fill[i]++] = -weight;
		columns[fill[j]] = i;
		values[fill[j]++] = -weight;
		diagonal[i] += weight;
		diagonal[j] += weight;
	};
	for (let i = 0; i < triangles.length; i += 3) {
		const a = slot[triangles[i]];
		const b = slot[triangles[i + 1]];
		const c = slot[triangles[i + 2]];
		if (a < 0 || b < 0 || c < 0) continue;
		const p = 3 * triangles[i];
		const q = 3 * triangles[i + 1];
		const r = 3 * triangles[i + 2];
		const ux = positions[q] - positions[p];
		const uy = positions[q + 1] - positions[p + 1];
		const uz = positions[q + 2] - positions[p + 2];
		const vx = positions[r] - positions[p];
		const vy = positions[r + 1] - positions[p + 1];
		const vz = positions[r + 2] - positions[p + 2];
		const doubleArea = Math.hypot(uy * vz - uz * vy, uz * vx - ux * vz, ux * vy - uy * vx);
		if (!(doubleArea > 0)) continue;
		const uu = ux * ux + uy * uy + uz * uz;
		const vv = vx * vx + vy * vy + vz * vz;
		const uv = ux * vx + uy * vy + uz * vz;
		const half = (0.5 * square) / doubleArea;
		// Half the cotangent of the angle opposite to each edge.
		put(b, c, half * uv);
		put(a, c, half * (uu - uv));
		put(a, b, half * (vv - uv));
	}
	return merge({ size, starts: room, columns, values, diagonal });
}

/** Adds up the entries of equal columns, in ascending order of columns. */
function merge(raw: SparseMatrix): SparseMatrix {
	const { size, starts, columns, values, diagonal } = raw;
	const merged = new Uint32Array(size + 1);
	let at = 0;
	for (let i = 0; i < size; i++) {
		const end = starts[i + 1];
		// Rows are short: a dozen entries, sorted where they stand; equal columns keep their order.
		for (let k = starts[i] + 1; k < end; k++) {
			const column = columns[k];
			const value = values[k];
			let j = k - 1;
			for (; j >= starts[i] && columns[j] > column; j--) {
				columns[j + 1] = columns[j];
				values[j + 1] = values[j];
			}
			columns[j + 1] = column;
			values[j + 1] = value;
		}
		for (let k = starts[i]; k < end; k++) {
			if (at > merged[i] && columns[at - 1] === columns[k]) values[at - 1] += values[k];
			else {
				columns[at] = columns[k];
				values[at++] = values[k];
			}
		}
		merged[i + 1] = at;
	}
	return { size, starts: merged, columns: columns.slice(0, at), values: values.slice(0, at), diagonal };
}

const MAX_ITERATIONS = 20_000;

/**
 * A x = b by conjugate gradients, preconditioned by one symmetric Gauss-Seidel sweep (Saad, Iterative Methods for Sparse
 * Linear Systems, 10.2).
 *
 * @param tolerance of the residual's length relative to that of b
 * @throws MorphError metric-singular when it does not settle
 */
export function solveSparse(matrix: SparseMatrix, b: Float64Array, tolerance: number): Float64Array {
	const { size, starts, columns, values, diagonal } = matrix;
	const x = new Float64Array(size);
	const residual = b.slice();
	const z = new Float64Array(size);
	const direction = new Float64Array(size);
	const image = new Float64Array(size);
	const precondition = () => {
		// (D + L) D^-1 (D + L') z = r
		for (let i = 0; i < size; i++) {
			let sum = residual[i];
			for (let k = starts[i]; k < starts[i + 1]; k++) {
				const j = columns[k];
				if (j >= i) break;
				sum -= values[k] * z[j];
			}
			z[i] = sum / diagonal[i];
		}
		for (let i = size - 1; i >= 0; i--) {
			let sum = 0;
			for (let k = starts[i + 1] - 1; k >= starts[i]; k--) {
				const j = columns[k];
				if (j <= i) break;
				sum += values[k] * z[j];
			}
			z[i] -= sum / diagonal[i];
		}
	};
	const inner = (p: Float64Array, q: Float64Array) => {
		let sum = 0;
		for (let i = 0; i < size; i++) sum += p[i] * q[i];
		return sum;
	};
	const goal = tolerance * Math.sqrt(inner(b, b));
	if (goal === 0) return x;
	let rho = 0;
	for (let iteration = 0; iteration < MAX_ITERATIONS; iteration++) {
		precondition();
		const next = inner(residual, z);
		const beta = iteration === 0 ? 0 : next / rho;
		rho = next;
		let curvature = 0;
		for (let i = 0; i < size; i++) direction[i] = z[i] + beta * direction[i];
		for (let i = 0; i < size; i++) {
			let sum = diagonal[i] * direction[i];
			for (let k = starts[i]; k < starts[i + 1]; k++) sum += values[k] * direction[columns[k]];
			image[i] = sum;
			curvature += sum * direction[i];
		}
		const length = rho / curvature;
		let left = 0;
		for (let i = 0; i < size; i++) {
			x[i] += length * direction[i];
			residual[i] -= length * image[i];
			left += residual[i] * residual[i];
		}
		if (Math.sqrt(left) <= goal) return x;
		if (!Number.isFinite(left)) break;
	}
	throw new MorphError(
		'metric-singular',
		'The smoothing of the surface does not settle.',
		'Take a shorter smoothing length, or repair triangles without area.'
	);
}
