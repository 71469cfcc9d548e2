import { MorphError } from './errors';
import { edgeTable } from './half-edges';
import { checkMesh, volumeOf, boundsCentre } from './surface';
import { TriangleTree } from './triangle-tree';

const CORNER = 1e-9;
/** Cells along the longest side of the grid that answers most queries; a cell is looked up once, when it is asked for. */
const GRID = 64;
/** Margin of the grid around the mesh, in shares of its longest side. */
const MARGIN = 0.125;

/** Signed distance with the sign of 'outside', and its gradient in the fields. */
export interface DistanceField {
	distance: number;
	gx: number;
	gy: number;
	gz: number;
	/** Answers exactly for distances in [low, high]; beyond, with anything beyond on the same side. */
	at(x: number, y: number, z: number, low: number, high: number): void;
}

/**
 * Signed distance to a closed mesh: positive outside. The magnitude is that of the nearest point; the sign comes from the
 * angle-weighted pseudonormal of the face, edge or vertex that holds it (Baerentzen and Aanaes, IEEE Transactions on
 * Visualization and Computer Graphics 11, 2005), which is right wherever the mesh is closed and does not cross itself.
 *
 * Distances to the centres of the cells of a coarse grid are kept as they are asked for: a distance changes by no more
 * than the way between two points, so they give the sign and a bound to most points at once, and a short search to the rest.
 */
export class SignedDistance implements DistanceField {
	private readonly tree: TriangleTree;
	private readonly faceNormals: Float64Array;
	private readonly vertexNormals: Float64Array;
	private readonly opposite: Int32Array;
	private readonly origin: [number, number, number];
	private readonly cell: number;
	private readonly size: [number, number, number];
	private readonly grid: Float64Array;

	/** Answer of the last `at`: the distance (metres, signed), its gradient (unit). */
	distance = 0;
	gx = 0;
	gy = 0;
	gz = 0;

	/**
	 * @param positions N x 3, metres; borrowed and kept
	 * @param triangles F x 3, outward; borrowed and kept
	 * @throws MorphError keep-out-open, keep-out-invalid, mesh-shape, mesh-non-finite
	 */
	constructor(
		private readonly positions: Float64Array,
		private readonly triangles: Uint32Array
	) {
		if (triangles.length === 0) {
			throw new MorphError('keep-out-invalid', 'The keep-out mesh has no triangles.', 'Upload a closed mesh.');
		}
		checkMesh(positions, triangles);
		const edges = edgeTable(triangles, positions.length / 3);
		if (edges.openCount > 0) {
			const triangle = Math.floor(edges.open.indexOf(1) / 3);
			throw new MorphError(
				'keep-out-open',
				`The keep-out mesh is open: ${edges.openCount} edges belong to one triangle only, the first of them in triangle ${triangle}.`,
				'Close its holes, or draw a box or a half-space instead.',
				{ triangle }
			);
		}
		if (edges.crowdedCount > 0 || edges.againstCount > 0) {
			const triangle = Math.floor((edges.crowdedCount > 0 ? edges.crowded : edges.against).indexOf(1) / 3);
			throw new MorphError(
				'keep-out-invalid',
				edges.crowdedCount > 0
					? `${edges.crowdedCount} edges of the keep-out mesh belong to more than two triangles, the first of them in triangle ${triangle}.`
					: `${edges.againstCount} edges of the keep-out mesh join triangles of opposite orientation, the first of them in triangle ${triangle}.`,
				edges.crowdedCount > 0
					? 'Separate the bodies that touch along an edge, or upload them one by one.'
					: 'Orient all triangles alike, counter-clockwise seen from outside.',
				{ triangle }
			);
		}
		if (!(volumeOf(positions, triangles, boundsCentre(positions)) > 0)) {
			throw new MorphError(
				'keep-out-invalid',
				'The keep-out mesh encloses no volume: its triangles look inward, or it is flat.',
				'Turn all its triangles round, so that they are counter-clockwise seen from outside.'
			);
		}
		this.opposite = edges.opposite;
		const { face, vertex } = pseudonormals(positions, triangles);
		this.faceNormals = face;
		this.vertexNormals = vertex;
		this.tree = new TriangleTree(positions, triangles);
		const b = this.tree.bounds;
		const longest = Math.max(b[3] - b[0], b[4] - b[1], b[5] - b[2]);
		const margin = MARGIN * longest;
		this.cell = (longest + 2 * margin) / GRID;
		this.origin = [b[0] - margin, b[1] - margin, b[2] - margin];
		this.size = [0, 1, 2].map((d) => Math.max(1, Math.ceil((b[3 + d] - b[d] + 2 * margin) / this.cell))) as [
			number,
			number,
			number
		];
		this.grid = new Float64Array(this.size[0] * this.size[1] * this.size[2]).fill(NaN);
	}

	/** Exact distance of a point whose nearest point lies within `reach`; sets the answer, or returns false. */
	private query(x: number, y: number, z: number, reach: number): boolean {
		const { tree } = this;
		if (!tree.closest(x, y, z, reach * reach)) return false;
		const t = 3 * tree.triangle;
		const wb = tree.weightB;
		const wc = tree.weightC;
		const wa = 1 - wb - wc;
		const p = this.positions;
		const [a, b, c] = [this.triangles[t], this.triangles[t + 1], this.triangles[t + 2]];
		const dx = x - (wa * p[3 * a] + wb * p[3 * b] + wc * p[3 * c]);
		const dy = y - (wa * p[3 * a + 1] + wb * p[3 * b + 1] + wc * p[3 * c + 1]);
		const dz = z - (wa * p[3 * a + 2] + wb * p[3 * b + 2] + wc * p[3 * c + 2]);
		let nx: number;
		let ny: number;
		let nz: number;
		const f = this.faceNormals;
		const corner = wa >= 1 - CORNER ? a : wb >= 1 - CORNER ? b : wc >= 1 - CORNER ? c : -1;
		if (corner >= 0) {
			nx = this.vertexNormals[3 * corner];
			ny = this.vertexNormals[3 * corner + 1];
			nz = this.vertexNormals[3 * corner + 2];
		} else {
			const edge = wc <= CORNER ? 0 : wa <= CORNER ? 1 : wb <= CORNER ? 2 : -1;
			nx = f[t];
			ny = f[t + 1];
			nz = f[t + 2];
			if (edge >= 0) {
				const o = this.opposite[t + edge];
				const other = 3 * Math.floor(o / 3);
				nx += f[other];
				ny += f[other + 1];
				nz += f[other + 2];
			}
		}
		const sign = dx * nx + dy * ny + dz * nz >= 0 ? 1 : -1;
		const d = Math.sqrt(tree.square);
		this.distance = sign * d;
		// On the surface itself the pseudonormal is the direction in which the distance grows.
		if (d > 1e-12 * this.cell) {
			this.gx = dx / this.distance;
			this.gy = dy / this.distance;
			this.gz = dz / this.distance;
		} else {
			const n = Math.sqrt(nx * nx + ny * ny + nz * nz) || 1;
			this.gx = nx / n;
			this.gy = ny / n;
			this.gz = nz / n;
		}
		return true;
	}

	/**
	 * Signed distance and gradient at a point where the distance lies in [low, high]; beyond, the gradient is (0, 0, 0) and
	 * the distance an infinity of the right sign, where that answer is the cheaper one.
	 */
	at(x: number, y: number, z: number, low: number, high: number): void {
		const [ox, oy, oz] = this.origin;
		const [sx, sy, sz] = this.size;
		const { cell } = this;
		const i = Math.floor((x - ox) / cell);
		const j = Math.floor((y - oy) / cell);
		const k = Math.floor((z - oz) / cell);
		if (i < 0 || j < 0 || k < 0 || i >= sx || j >= sy || k >= sz) {
			// Outside the grid is outside the mesh.
			if (!this.query(x, y, z, high)) this.beyond(Infinity);
			return;
		}
		const at = (i * sy + j) * sz + k;
		const [cx, cy, cz] = [ox + (i + 0.5) * cell, oy + (j + 0.5) * cell, oz + (k + 0.5) * cell];
		let centre = this.grid[at];
		if (Number.isNaN(centre)) {
			this.query(cx, cy, cz, Infinity);
			centre = this.grid[at] = this.distance;
		}
		const way = Math.sqrt((x - cx) ** 2 + (y - cy) ** 2 + (z - cz) ** 2);
		if (centre - way > high) return this.beyond(Infinity);
		if (centre + way < low) return this.beyond(-Infinity);
		// A little longer than the bound, against roundoff.
		this.query(x, y, z, (Math.abs(centre) + way) * (1 + 1e-9) + 1e-12 * cell);
	}

	private beyond(distance: number): void {
		this.distance = distance;
		this.gx = this.gy = this.gz = 0;
	}

	/** The tree over the mesh's triangles, for those who look for crossings. */
	get triangleTree(): TriangleTree {
		return this.tree;
	}
}

/** Unit face normals, and vertex sums of them weighted by the angle at the vertex. */
function pseudonormals(p: Float64Array, triangles: Uint32Array): { face: Float64Array; vertex: Float64Array } {
	const face = new Float64Array(triangles.length);
	const vertex = new Float64Array(p.length);
	for (let t = 0; t < triangles.length; t += 3) {
		const n = [0, 0, 0];
		const e: number[][] = [];
		for (let k = 0; k < 3; k++) {
			const a = 3 * triangles[t + k];
			const b = 3 * triangles[t + ((k + 1) % 3)];
			e.push([p[b] - p[a], p[b + 1] - p[a + 1], p[b + 2] - p[a + 2]]);
		}
		n[0] = e[2][1] * e[0][2] - e[2][2] * e[0][1];
		n[1] = e[2][2] * e[0][0] - e[2][0] * e[0][2];
		n[2] = e[2][0] * e[0][1] - e[2][1] * e[0][0];
		const length = Math.hypot(n[0], n[1], n[2]);
		if (length === 0) continue;
		for (let d = 0; d < 3; d++) face[t + d] = n[d] / length;
		for (let k = 0; k < 3; k++) {
			// Between the edge out of the corner and the one into it, turned round.
			const u = e[k];
			const w = e[(k + 2) % 3];
			const angle = Math.atan2(length, -(u[0] * w[0] + u[1] * w[1] + u[2] * w[2]));
			const v = 3 * triangles[t + k];
			for (let d = 0; d < 3; d++) vertex[v + d] += angle * face[t + d];
		}
	}
	return { face, vertex };
}
