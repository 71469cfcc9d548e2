/** Area-weighted normals of some vertices only, at changing positions of the same triangles. */
export class VertexNormals {
	/** Offsets of the triangles with a corner among the vertices. */
	private readonly faces: Uint32Array;
	/** N x 3; meaningful at the vertices given. */
	readonly normals: Float64Array;

	constructor(
		private readonly triangles: Uint32Array,
		private readonly vertices: Uint32Array,
		n: number
	) {
		const mark = new Uint8Array(n);
		for (let i = 0; i < vertices.length; i++) mark[vertices[i]] = 1;
		const faces: number[] = [];
		for (let t = 0; t < triangles.length; t += 3) {
			if (mark[triangles[t]] | mark[triangles[t + 1]] | mark[triangles[t + 2]]) faces.push(t);
		}
		this.faces = Uint32Array.from(faces);
		this.normals = new Float64Array(3 * n);
	}

	/** Area-weighted unit normals of the vertices, at 3 v; (0, 0, 0) without area. */
	update(p: Float64Array): void {
		const { faces, triangles, normals, vertices } = this;
		normals.fill(0);
		for (let i = 0; i < faces.length; i++) {
			const t = faces[i];
			const a = 3 * triangles[t];
			const b = 3 * triangles[t + 1];
			const c = 3 * triangles[t + 2];
			const ux = p[b] - p[a];
			const uy = p[b + 1] - p[a + 1];
			const uz = p[b + 2] - p[a + 2];
			const vx = p[c] - p[a];
			const vy = p[c + 1] - p[a + 1];
			const vz = p[c + 2] - p[a + 2];
			const x = uy * vz - uz * vy;
			const y = uz * vx - ux * vz;
			const z = ux * vy - uy * vx;
			normals[a] += x;
			normals[a + 1] += y;
			normals[a + 2] += z;
			normals[b] += x;
			normals[b + 1] += y;
			normals[b + 2] += z;
			normals[c] += x;
			normals[c + 1] += y;
			normals[c + 2] += z;
		}
		for (let i = 0; i < vertices.length; i++) {
			const v = 3 * vertices[i];
			const length = Math.sqrt(normals[v] ** 2 + normals[v + 1] ** 2 + normals[v + 2] ** 2);
			const scale = length > 0 ? 1 / length : 0;
			normals[v] *= scale;
			normals[v + 1] *= scale;
			normals[v + 2] *= scale;
		}
	}
}
