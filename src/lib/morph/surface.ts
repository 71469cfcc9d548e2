import { MorphError } from './errors';
import { onPlane } from './symmetry';
import type { Checkpoint, Mesh, Surface, SymmetryPlane, WithCheckpoint } from './types';

const CHECKPOINT_TRIANGLES = 1 << 17;

/**
 * Positions of a file in metres.
 * @param positions N x 3 in the file's unit, borrowed
 * @param metresPerUnit length of the file's unit
 */
export function toMetres(positions: Float32Array, metresPerUnit: number): Float64Array {
	const out = new Float64Array(positions.length);
	if (metresPerUnit === 1) out.set(positions);
	else for (let i = 0; i < out.length; i++) out[i] = positions[i] * metresPerUnit;
	return out;
}

/**
 * Whether the boundary of the surface, as a chain of directed edges, is zero: every edge is used equally often in both
 * directions. That is what makes the enclosed volume independent of the origin. Edges between two vertices of `ignored`
 * do not count: a half model is closed by its symmetry plane.
 *
 * Each directed edge adds its hash, with the sign of its direction, to two 32-bit sums; only a zero chain gives zero
 * sums for every hash, and another chain passes with a probability of about 2^-64.
 */
export function isWatertight(triangles: Uint32Array, ignored: Uint8Array | null = null): boolean {
	let sumA = 0;
	let sumB = 0;
	for (let i = 0; i < triangles.length; i += 3) {
		for (let k = 0; k < 3; k++) {
			const a = triangles[i + k];
			const b = triangles[i + (k === 2 ? 0 : k + 1)];
			if (a === b || (ignored && ignored[a] & ignored[b])) continue;
			const low = a < b ? a : b;
			const high = a < b ? b : a;
			let h = Math.imul(low ^ 0x9e3779b9, 0x85ebca6b) ^ Math.imul(high + 0x7f4a7c15, 0xc2b2ae35);
			h ^= h >>> 15;
			h = Math.imul(h, 0x2c1b3c6d);
			h ^= h >>> 12;
			let g = Math.imul(h ^ high, 0x297a2d39) + low;
			g ^= g >>> 15;
			g = Math.imul(g, 0x85ebca6b);
			g ^= g >>> 13;
			if (a < b) {
				sumA = (sumA + h) | 0;
				sumB = (sumB + g) | 0;
			} else {
				sumA = (sumA - h) | 0;
				sumB = (sumB - g) | 0;
			}
		}
	}
	return sumA === 0 && sumB === 0;
}

/**
 * Signed volume by the divergence theorem, V = 1/6 sum p . (q x r), about an origin (any, for a closed surface; one
 * near the surface loses fewest digits).
 * @param positions N x 3
 * @param triangles F x 3
 */
export function volumeOf(
	positions: Float64Array,
	triangles: Uint32Array,
	origin: readonly [number, number, number] = [0, 0, 0]
): number {
	const [ox, oy, oz] = origin;
	let sum = 0;
	for (let i = 0; i < triangles.length; i += 3) {
		const a = 3 * triangles[i];
		const b = 3 * triangles[i + 1];
		const c = 3 * triangles[i + 2];
		const ax = positions[a] - ox;
		const ay = positions[a + 1] - oy;
		const az = positions[a + 2] - oz;
		const bx = positions[b] - ox;
		const by = positions[b + 1] - oy;
		const bz = positions[b + 2] - oz;
		const cx = positions[c] - ox;
		const cy = positions[c + 1] - oy;
		const cz = positions[c + 2] - oz;
		sum += ax * (by * cz - bz * cy) + ay * (bz * cx - bx * cz) + az * (bx * cy - by * cx);
	}
	return sum / 6;
}

/** Centre of the bounding box of N x 3 positions; the origin for an empty array. */
export function boundsCentre(positions: Float64Array): [number, number, number] {
	const centre: [number, number, number] = [0, 0, 0];
	if (positions.length === 0) return centre;
	for (let d = 0; d < 3; d++) {
		let low = Infinity;
		let high = -Infinity;
		for (let i = d; i < positions.length; i += 3) {
			const x = positions[i];
			if (x < low) low = x;
			if (x > high) high = x;
		}
		centre[d] = (low + high) / 2;
	}
	return centre;
}

/**
 * Exact gradient of the volume by the vertices: dV/dx_v = 1/6 sum over triangles (v, b, c) of x_b x x_c.
 * @returns N x 3, unit of the positions squared
 */
export function volumeGradient(
	positions: Float64Array,
	triangles: Uint32Array,
	origin: readonly [number, number, number] = [0, 0, 0]
): Float64Array {
	const [ox, oy, oz] = origin;
	const out = new Float64Array(positions.length);
	for (let i = 0; i < triangles.length; i += 3) {
		const a = 3 * triangles[i];
		const b = 3 * triangles[i + 1];
		const c = 3 * triangles[i + 2];
		addCross(out, a, positions, b, c, ox, oy, oz);
		addCross(out, b, positions, c, a, ox, oy, oz);
		addCross(out, c, positions, a, b, ox, oy, oz);
	}
	return out;
}

function addCross(
	out: Float64Array,
	v: number,
	p: Float64Array,
	b: number,
	c: number,
	ox: number,
	oy: number,
	oz: number
): void {
	const bx = p[b] - ox;
	const by = p[b + 1] - oy;
	const bz = p[b + 2] - oz;
	const cx = p[c] - ox;
	const cy = p[c + 1] - oy;
	const cz = p[c + 2] - oz;
	out[v] += (by * cz - bz * cy) / 6;
	out[v + 1] += (bz * cx - bx * cz) / 6;
	out[v + 2] += (bx * cy - by * cx) / 6;
}

/**
 * Lumped mass (a third of the area of the triangles at each vertex) and unit normals weighted by area.
 * @returns mass N, normals N x 3 ((0,0,0) where a vertex has no area), the area
 */
export function geometry(
	positions: Float64Array,
	triangles: Uint32Array,
	options: WithCheckpoint = {}
): { mass: Float64Array; normals: Float64Array; area: number } {
	const n = positions.length / 3;
	const mass = new Float64Array(n);
	const normals = new Float64Array(3 * n);
	let total = 0;
	for (let i = 0; i < triangles.length; i += 3) {
		const a = triangles[i];
		const b = triangles[i + 1];
		const c = triangles[i + 2];
		const ax = positions[3 * a];
		const ay = positions[3 * a + 1];
		const az = positions[3 * a + 2];
		const ux = positions[3 * b] - ax;
		const uy = positions[3 * b + 1] - ay;
		const uz = positions[3 * b + 2] - az;
		const vx = positions[3 * c] - ax;
		const vy = positions[3 * c + 1] - ay;
		const vz = positions[3 * c + 2] - az;
		const x = uy * vz - uz * vy;
		const y = uz * vx - ux * vz;
		const z = ux * vy - uy * vx;
		const area = 0.5 * Math.sqrt(x * x + y * y + z * z);
		total += area;
		mass[a] += area / 3;
		mass[b] += area / 3;
		mass[c] += area / 3;
		normals[3 * a] += x;
		normals[3 * a + 1] += y;
		normals[3 * a + 2] += z;
		normals[3 * b] += x;
		normals[3 * b + 1] += y;
		normals[3 * b + 2] += z;
		normals[3 * c] += x;
		normals[3 * c + 1] += y;
		normals[3 * c + 2] += z;
		if (options.checkpoint && i % (3 * CHECKPOINT_TRIANGLES) === 0) options.checkpoint(i / triangles.length);
	}
	for (let i = 0; i < normals.length; i += 3) {
		const x = normals[i];
		const y = normals[i + 1];
		const z = normals[i + 2];
		const length = Math.sqrt(x * x + y * y + z * z);
		if (length > 0) {
			normals[i] = x / length;
			normals[i + 1] = y / length;
			normals[i + 2] = z / length;
		}
	}
	return { mass, normals, area: total };
}

/** Refuses indices out of range and coordinates that are not finite. */
export function checkMesh(positions: ArrayLike<number>, triangles: Uint32Array): void {
	const n = positions.length / 3;
	if (!Number.isInteger(n) || triangles.length % 3 !== 0 || triangles.length === 0) {
		throw new MorphError(
			'mesh-shape',
			`${positions.length} coordinates and ${triangles.length} corners do not make a triangle mesh.`,
			'Give three coordinates per vertex and three corners per triangle, at least one triangle.'
		);
	}
	for (let i = 0; i < triangles.length; i++) {
		if (triangles[i] >= n) {
			const triangle = Math.floor(i / 3);
			throw new MorphError(
				'mesh-shape',
				`Triangle ${triangle} refers to vertex ${triangles[i]}, but there are only ${n}.`,
				'Give vertex indices from 0 to the number of vertices less one.',
				{ triangle, vertex: triangles[i] }
			);
		}
	}
	for (let i = 0; i < positions.length; i++) {
		if (!Number.isFinite(positions[i])) {
			const vertex = Math.floor(i / 3);
			throw new MorphError(
				'mesh-non-finite',
				`Vertex ${vertex} has a coordinate that is not a finite number.`,
				'Repair that vertex where the surface was made.',
				{ vertex }
			);
		}
	}
}

/**
 * A surface with mass, normals, volume and its gradient.
 * @param positions N x 3 in metres; kept, not copied
 * @param triangles F x 3; kept, not copied
 * @param options symmetry: the plane of a half model, whose open edges in the plane then count as closed by it
 * @throws MorphError mesh-shape, mesh-non-finite
 */
export function makeSurface(
	positions: Float64Array,
	triangles: Uint32Array,
	options: { checkpoint?: Checkpoint; symmetry?: SymmetryPlane } = {}
): Surface {
	checkMesh(positions, triangles);
	const closed = isWatertight(triangles);
	const { symmetry } = options;
	const half = !closed && symmetry !== undefined && isWatertight(triangles, onPlane(positions, symmetry));
	const { mass, normals, area } = geometry(positions, triangles, options);
	// About a point in the plane the missing cap of a half model adds nothing.
	const origin = closed ? boundsCentre(positions) : half ? symmetry.point : ([0, 0, 0] as [number, number, number]);
	options.checkpoint?.(1);
	return {
		positions,
		triangles,
		mass,
		normals,
		volumeGradient: volumeGradient(positions, triangles, origin),
		area,
		volume: volumeOf(positions, triangles, origin),
		watertight: closed || half,
		origin
	};
}

/** makeSurface on a mesh as it stands in a file. */
export function meshToSurface(mesh: Mesh, metresPerUnit: number, options: WithCheckpoint = {}): Surface {
	return makeSurface(toMetres(mesh.positions, metresPerUnit), mesh.triangles, options);
}
