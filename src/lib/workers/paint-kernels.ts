/** Which triangles a brush, a fill or a box reaches: pure, on the surface at rest. */
import { edgeTable, embed, type DesignBox } from '$lib/morph';
import type { Vec3 } from './display-protocol';

/** Triangles of one surface and who their neighbours are; built once, asked often. Arrays are borrowed. */
export class SurfaceReach {
	readonly #opposite: Int32Array;
	/** F x 3, unit; 0 for a triangle without area. */
	readonly #normals: Float32Array;

	/**
	 * @param positions N x 3, metres
	 * @param triangles F x 3
	 */
	constructor(
		readonly positions: Float64Array,
		readonly triangles: Uint32Array
	) {
		this.#opposite = edgeTable(triangles, positions.length / 3).opposite;
		this.#normals = faceNormals(positions, triangles);
	}

	/**
	 * What hangs together with a triangle and has its middle within a distance of a point: a thin wall's other side does not.
	 * @param radius metres
	 * @returns ids, ascending; the triangle itself at least
	 */
	brush(triangle: number, point: Vec3, radius: number): Uint32Array {
		const { positions: p, triangles } = this;
		const near = (t: number) => {
			let sum = 0;
			for (let k = 0; k < 3; k++) {
				const [a, b, c] = [triangles[3 * t], triangles[3 * t + 1], triangles[3 * t + 2]];
				sum += ((p[3 * a + k] + p[3 * b + k] + p[3 * c + k]) / 3 - point[k]) ** 2;
			}
			return sum <= radius * radius;
		};
		return this.#spread(triangle, (_from, to) => near(to));
	}

	/**
	 * What can be reached from a triangle without crossing an edge that bends by more than an angle.
	 * @param angle radians between the normals of two neighbours
	 * @returns ids, ascending; the triangle itself at least
	 */
	fill(triangle: number, angle: number): Uint32Array {
		const n = this.#normals;
		// Rounding of the float32 normals must not stop a fill over a flat face at the angle 0.
		const least = Math.cos(Math.min(Math.PI, angle)) - 1e-6;
		return this.#spread(
			triangle,
			(from, to) => n[3 * from] * n[3 * to] + n[3 * from + 1] * n[3 * to + 1] + n[3 * from + 2] * n[3 * to + 2] >= least
		);
	}

	/** Triangles with all three corners in a box; ascending. */
	inBox(box: DesignBox): Uint32Array {
		const { triangles } = this;
		const inside = new Uint8Array(this.positions.length / 3);
		for (const v of embed(this.positions, box).inside) inside[v] = 1;
		const found: number[] = [];
		for (let t = 0; 3 * t < triangles.length; t++) {
			if (inside[triangles[3 * t]] && inside[triangles[3 * t + 1]] && inside[triangles[3 * t + 2]]) found.push(t);
		}
		return Uint32Array.from(found);
	}

	#spread(first: number, joins: (from: number, to: number) => boolean): Uint32Array {
		const seen = new Set([first]);
		const todo = [first];
		for (let from = todo.pop(); from !== undefined; from = todo.pop()) {
			for (let edge = 3 * from; edge < 3 * from + 3; edge++) {
				if (this.#opposite[edge] < 0) continue;
				const to = Math.floor(this.#opposite[edge] / 3);
				if (seen.has(to) || !joins(from, to)) continue;
				seen.add(to);
				todo.push(to);
			}
		}
		return Uint32Array.from(seen).sort();
	}
}

function faceNormals(p: Float64Array, triangles: Uint32Array): Float32Array {
	const normals = new Float32Array(triangles.length);
	for (let t = 0; t < triangles.length; t += 3) {
		const [a, b, c] = [3 * triangles[t], 3 * triangles[t + 1], 3 * triangles[t + 2]];
		const [ux, uy, uz] = [p[b] - p[a], p[b + 1] - p[a + 1], p[b + 2] - p[a + 2]];
		const [vx, vy, vz] = [p[c] - p[a], p[c + 1] - p[a + 1], p[c + 2] - p[a + 2]];
		const [x, y, z] = [uy * vz - uz * vy, uz * vx - ux * vz, ux * vy - uy * vx];
		const size = Math.hypot(x, y, z) || 1;
		normals[t] = x / size;
		normals[t + 1] = y / size;
		normals[t + 2] = z / size;
	}
	return normals;
}
