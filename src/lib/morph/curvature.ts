import { VertexNormals } from './vertex-normals';

/** Points that a fit of five coefficients needs at least. */
const LEAST_POINTS = 6;
/** Pivot, relative to the first, below which the points do not determine the fit (all on one line, say). */
const SINGULAR = 1e-9;

export interface Curvatures {
	/** Larger principal curvature of each vertex asked for, 1/m; above 0: convex. NaN where the mesh does not determine it. */
	largest: Float64Array;
	/** Smaller principal curvature, 1/m; below 0: concave. */
	smallest: Float64Array;
}

export interface RadiusPlace {
	/** Metres; Infinity where nothing is curved that way. */
	radius: number;
	/** Vertex id; -1 for none. */
	vertex: number;
}

/**
 * Principal curvatures at vertices, by fitting osculating jets of degree 2 (Cazals and Pouget, Computer Aided Geometric
 * Design 22, 2005): in the frame of the vertex's normal the heights of the vertices within two edges are fitted by
 * b u + c v + (A u^2 + 2 B u v + C v^2) / 2, weighted by the inverse squared distance, and the curvatures read from the
 * fitted patch's fundamental forms. It converges on irregular meshes, where estimates from normals of one ring do not
 * (docs/numerics.md has the figures), and at open edges takes the points that there are.
 */
export class CurvatureProbe {
	private readonly normals: VertexNormals;
	/** vertices + 1 offsets, and the vertices within two edges of each. */
	private readonly starts: Uint32Array;
	private readonly around: Uint32Array;

	/**
	 * @param triangles F x 3; borrowed
	 * @param vertices ids of the vertices asked for; borrowed and kept
	 */
	constructor(
		triangles: Uint32Array,
		vertexCount: number,
		readonly vertices: Uint32Array
	) {
		this.normals = new VertexNormals(triangles, vertices, vertexCount);
		const start = new Uint32Array(vertexCount + 1);
		for (let c = 0; c < triangles.length; c++) start[triangles[c] + 1]++;
		for (let v = 0; v < vertexCount; v++) start[v + 1] += start[v];
		const fill = start.slice(0, vertexCount);
		const corners = new Uint32Array(triangles.length);
		for (let c = 0; c < triangles.length; c++) corners[fill[triangles[c]]++] = c - (c % 3);
		const seen = new Uint32Array(vertexCount);
		let around = new Uint32Array(20 * vertices.length + 64);
		this.starts = new Uint32Array(vertices.length + 1);
		let end = 0;
		for (let i = 0; i < vertices.length; i++) {
			const begin = end;
			seen[vertices[i]] = i + 1;
			const gather = (v: number) => {
				for (let k = start[v]; k < start[v + 1]; k++) {
					for (let d = 0; d < 3; d++) {
						const w = triangles[corners[k] + d];
						if (seen[w] === i + 1) continue;
						seen[w] = i + 1;
						if (end === around.length) {
							const more = new Uint32Array(2 * end);
							more.set(around);
							around = more;
						}
						around[end++] = w;
					}
				}
			};
			gather(vertices[i]);
			const ring = end;
			for (let k = begin; k < ring; k++) gather(around[k]);
			this.starts[i + 1] = end;
		}
		this.around = around.slice(0, end);
	}

	/** @param p N x 3 positions, metres; borrowed */
	at(p: Float64Array): Curvatures {
		const { vertices, starts, around, normals } = this;
		normals.update(p);
		const n = normals.normals;
		const largest = new Float64Array(vertices.length).fill(NaN);
		const smallest = new Float64Array(vertices.length).fill(NaN);
		// Upper triangle of the 5 x 5 normal equations and their right side.
		const m = new Float64Array(30);
		const row = new Float64Array(5);
		for (let i = 0; i < vertices.length; i++) {
			const v = 3 * vertices[i];
			const nx = n[v];
			const ny = n[v + 1];
			const nz = n[v + 2];
			const points = starts[i + 1] - starts[i];
			if (points < LEAST_POINTS || (nx === 0 && ny === 0 && nz === 0)) continue;
			// Any tangent, then the second so that (u, v, n) is right-handed.
			let ux = Math.abs(nx) < 0.6 ? 0 : -nz;
			let uy = Math.abs(nx) < 0.6 ? nz : 0;
			let uz = Math.abs(nx) < 0.6 ? -ny : nx;
			const length = Math.sqrt(ux * ux + uy * uy + uz * uz);
			ux /= length;
			uy /= length;
			uz /= length;
			const vx = ny * uz - nz * uy;
			const vy = nz * ux - nx * uz;
			const vz = nx * uy - ny * ux;
			let scale = 0;
			for (let k = starts[i]; k < starts[i + 1]; k++) {
				const o = 3 * around[k];
				scale += (p[o] - p[v]) ** 2 + (p[o + 1] - p[v + 1]) ** 2 + (p[o + 2] - p[v + 2]) ** 2;
			}
			scale = Math.sqrt(scale / points);
			if (!(scale > 0)) continue;
			m.fill(0);
			for (let k = starts[i]; k < starts[i + 1]; k++) {
				const o = 3 * around[k];
				const dx = (p[o] - p[v]) / scale;
				const dy = (p[o + 1] - p[v + 1]) / scale;
				const dz = (p[o + 2] - p[v + 2]) / scale;
				const a = dx * ux + dy * uy + dz * uz;
				const b = dx * vx + dy * vy + dz * vz;
				const height = dx * nx + dy * ny + dz * nz;
				const square = a * a + b * b;
				// A point straight above or below says nothing about the patch.
				if (!(square > 1e-12)) continue;
				const weight = 1 / square;
				row[0] = a;
				row[1] = b;
				row[2] = 0.5 * a * a;
				row[3] = a * b;
				row[4] = 0.5 * b * b;
				for (let r = 0; r < 5; r++) {
					const w = weight * row[r];
					for (let c = r; c < 5; c++) m[6 * r + c] += w * row[c];
					m[6 * r + 5] += w * height;
				}
			}
			if (!solveFive(m)) continue;
			const b = m[5];
			const c = m[11];
			const [aa, ab, bb] = [m[17] / scale, m[23] / scale, m[29] / scale];
			const e = 1 + b * b;
			const f = b * c;
			const g = 1 + c * c;
			const w = e + c * c;
			const root = Math.sqrt(w);
			// Against the outward normal, so that a ball's curvature is positive.
			const mean = -(aa * g - 2 * ab * f + bb * e) / (2 * w * root);
			const gauss = (aa * bb - ab * ab) / (w * w);
			const half = Math.sqrt(Math.max(0, mean * mean - gauss));
			largest[i] = mean + half;
			smallest[i] = mean - half;
		}
		return { largest, smallest };
	}
}

/**
 * Solves the symmetric positive definite system whose upper triangle stands in rows of six (five entries and the right
 * side); the solution replaces the right sides.
 */
function solveFive(m: Float64Array): boolean {
	let top = 0;
	for (let r = 0; r < 5; r++) {
		const pivot = m[7 * r];
		if (r === 0) top = pivot;
		if (!(pivot > SINGULAR * top)) return false;
		for (let s = r + 1; s < 5; s++) {
			const factor = m[6 * r + s] / pivot;
			for (let c = s; c < 6; c++) m[6 * s + c] -= factor * m[6 * r + c];
		}
	}
	for (let r = 4; r >= 0; r--) {
		let x = m[6 * r + 5];
		for (let c = r + 1; c < 5; c++) x -= m[6 * r + c] * m[6 * c + 5];
		m[6 * r + 5] = x / m[7 * r];
	}
	return true;
}

/** The smallest radii of curvature among the probe's vertices, on convex and on concave ground. */
export function smallestRadii(
	vertices: Uint32Array,
	{ largest, smallest }: Curvatures
): {
	convex: RadiusPlace;
	concave: RadiusPlace;
} {
	const convex: RadiusPlace = { radius: Infinity, vertex: -1 };
	const concave: RadiusPlace = { radius: Infinity, vertex: -1 };
	for (let i = 0; i < vertices.length; i++) {
		if (largest[i] > 0 && 1 / largest[i] < convex.radius) {
			convex.radius = 1 / largest[i];
			convex.vertex = vertices[i];
		}
		if (smallest[i] < 0 && -1 / smallest[i] < concave.radius) {
			concave.radius = -1 / smallest[i];
			concave.vertex = vertices[i];
		}
	}
	return { convex, concave };
}
