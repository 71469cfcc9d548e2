import { BufferAttribute, BufferGeometry } from 'three';
import { MeshBVH } from 'three-mesh-bvh';

const LEAF_TRIANGLES = 4;
const STACK = 128;
const UNUSED = 0xffffffff;

/**
 * Bounding boxes of a mesh's triangles in a tree. three-mesh-bvh sorts the triangles; the loops that descend are our own,
 * on flat arrays in float64, since a call into the library costs more than a whole query of a nearby place (4 us against
 * 0.5 us), and a move asks for hundreds of thousands.
 *
 * Nodes stand in the order of a depth-first walk: a node's first child follows it, its second child is `right`.
 */
export class TriangleTree {
	/** nodes x 6: lower corner, upper corner. */
	readonly bounds: Float64Array;
	/** Second child of an inner node; -1 for a leaf. */
	readonly right: Int32Array;
	/** Leaf: first place in `order`. */
	readonly first: Uint32Array;
	/** Leaf: triangles. */
	readonly count: Uint32Array;
	/** Triangle ids, leaf after leaf. */
	readonly order: Uint32Array;
	/** order.length x 3: their corners, as indices into `points`. */
	readonly corners: Uint32Array;
	/** Vertices in the order in which the leaves first name them (M x 3): neighbours lie side by side, which caches like. */
	readonly points: Float64Array;
	/** M vertex ids of `points`. */
	readonly vertices: Uint32Array;
	/** N: index into `points` of each vertex; 0xffffffff for those in none of the triangles. */
	readonly ranks: Uint32Array;
	/** N x 3; those of the last refit. */
	positions: Float64Array;

	/** Answer of the last query: triangle id, -1 for none. */
	triangle = -1;
	/** Answer of `closest`: squared distance. */
	square = 0;
	/** Answer of `closest` and `ray`: barycentric weights of the second and the third corner. */
	weightB = 0;
	weightC = 0;
	/** Answer of `ray`: distance in units of the direction. */
	distance = 0;

	private readonly stack = new Int32Array(STACK);
	private readonly keys = new Float64Array(STACK);

	/**
	 * @param positions N x 3; borrowed and kept
	 * @param triangles F x 3; borrowed
	 * @param subset triangle ids to put in the tree; default all
	 */
	constructor(positions: Float64Array, triangles: Uint32Array, subset?: Uint32Array) {
		this.positions = positions;
		let index = triangles;
		if (subset) {
			index = new Uint32Array(3 * subset.length);
			for (let i = 0; i < subset.length; i++) {
				for (let k = 0; k < 3; k++) index[3 * i + k] = triangles[3 * subset[i] + k];
			}
		}
		const geometry = new BufferGeometry();
		geometry.setAttribute('position', new BufferAttribute(positions, 3));
		geometry.setIndex(new BufferAttribute(index, 1));
		// Indirect: the library sorts a list of its own and leaves the mesh's triangle order alone.
		const tree = new MeshBVH(geometry, { indirect: true, targetLeafSize: LEAF_TRIANGLES, setBoundingBox: false });
		const faces = index.length / 3;
		const right: number[] = [];
		const first: number[] = [];
		const count: number[] = [];
		const depths: number[] = [];
		// The last node met at each depth: a node's second child is the second one met below it.
		const open: number[] = [];
		tree.traverse((depth, isLeaf, _bounds, offset, size) => {
			const node = right.length;
			right.push(isLeaf ? -1 : 0);
			first.push(isLeaf ? offset : 0);
			count.push(isLeaf ? size : 0);
			depths.push(depth);
			if (depth > 0 && open[depth - 1] !== node - 1) right[open[depth - 1]] = node;
			open[depth] = node;
		});
		this.right = Int32Array.from(right);
		this.first = Uint32Array.from(first);
		this.count = Uint32Array.from(count);
		this.order = new Uint32Array(faces);
		this.corners = new Uint32Array(3 * faces);
		for (let i = 0; i < faces; i++) {
			const t = tree.resolveTriangleIndex(i);
			this.order[i] = subset ? subset[t] : t;
			for (let k = 0; k < 3; k++) this.corners[3 * i + k] = index[3 * t + k];
		}
		this.ranks = new Uint32Array(positions.length / 3).fill(UNUSED);
		const vertices = new Uint32Array(this.ranks.length);
		let used = 0;
		for (let i = 0; i < this.corners.length; i++) {
			const v = this.corners[i];
			if (this.ranks[v] === UNUSED) {
				this.ranks[v] = used;
				vertices[used++] = v;
			}
			this.corners[i] = this.ranks[v];
		}
		this.vertices = vertices.slice(0, used);
		this.points = new Float64Array(3 * used);
		this.bounds = new Float64Array(6 * right.length);
		this.refit(positions);
	}

	/**
	 * Fits the boxes to other positions of the same vertices: linear, about a fifth of the time of a new tree, and as good
	 * while the vertices move by less than the triangles' spacing or so.
	 * @param positions N x 3; borrowed and kept
	 */
	refit(positions: Float64Array): void {
		this.positions = positions;
		const { bounds, right, first, count, corners, points, vertices } = this;
		for (let i = 0; i < vertices.length; i++) {
			const v = 3 * vertices[i];
			points[3 * i] = positions[v];
			points[3 * i + 1] = positions[v + 1];
			points[3 * i + 2] = positions[v + 2];
		}
		for (let node = right.length - 1; node >= 0; node--) {
			let x0 = Infinity;
			let y0 = Infinity;
			let z0 = Infinity;
			let x1 = -Infinity;
			let y1 = -Infinity;
			let z1 = -Infinity;
			if (right[node] < 0) {
				const end = 3 * (first[node] + count[node]);
				for (let i = 3 * first[node]; i < end; i++) {
					const v = 3 * corners[i];
					const x = points[v];
					const y = points[v + 1];
					const z = points[v + 2];
					if (x < x0) x0 = x;
					if (x > x1) x1 = x;
					if (y < y0) y0 = y;
					if (y > y1) y1 = y;
					if (z < z0) z0 = z;
					if (z > z1) z1 = z;
				}
			} else {
				const a = 6 * (node + 1);
				const b = 6 * right[node];
				x0 = bounds[a] < bounds[b] ? bounds[a] : bounds[b];
				y0 = bounds[a + 1] < bounds[b + 1] ? bounds[a + 1] : bounds[b + 1];
				z0 = bounds[a + 2] < bounds[b + 2] ? bounds[a + 2] : bounds[b + 2];
				x1 = bounds[a + 3] > bounds[b + 3] ? bounds[a + 3] : bounds[b + 3];
				y1 = bounds[a + 4] > bounds[b + 4] ? bounds[a + 4] : bounds[b + 4];
				z1 = bounds[a + 5] > bounds[b + 5] ? bounds[a + 5] : bounds[b + 5];
			}
			const o = 6 * node;
			bounds[o] = x0;
			bounds[o + 1] = y0;
			bounds[o + 2] = z0;
			bounds[o + 3] = x1;
			bounds[o + 4] = y1;
			bounds[o + 5] = z1;
		}
	}

	/** Squared distance of a point to a node's box. */
	private boxSquare(node: number, x: number, y: number, z: number): number {
		const b = this.bounds;
		const o = 6 * node;
		let d = 0;
		if (x < b[o]) d = b[o] - x;
		else if (x > b[o + 3]) d = x - b[o + 3];
		let square = d * d;
		d = 0;
		if (y < b[o + 1]) d = b[o + 1] - y;
		else if (y > b[o + 4]) d = y - b[o + 4];
		square += d * d;
		d = 0;
		if (z < b[o + 2]) d = b[o + 2] - z;
		else if (z > b[o + 5]) d = z - b[o + 5];
		return square + d * d;
	}

	/**
	 * Triangles whose leaf's box meets a box (x0, y0, z0) to (x1, y1, z1).
	 * @param found called with offsets into `corners`; true ends the search
	 */
	meeting(
		x0: number,
		y0: number,
		z0: number,
		x1: number,
		y1: number,
		z1: number,
		found: (offset: number) => boolean
	): boolean {
		const { bounds: b, right, first, count, stack } = this;
		let top = 0;
		stack[top++] = 0;
		while (top > 0) {
			const node = stack[--top];
			const o = 6 * node;
			if (b[o] > x1 || b[o + 3] < x0 || b[o + 1] > y1 || b[o + 4] < y0 || b[o + 2] > z1 || b[o + 5] < z0) continue;
			if (right[node] >= 0) {
				stack[top++] = right[node];
				stack[top++] = node + 1;
				continue;
			}
			for (let i = first[node]; i < first[node] + count[node]; i++) if (found(3 * i)) return true;
		}
		return false;
	}

	/**
	 * Nearest point of the mesh within a distance: sets triangle, square, weightB, weightC.
	 * @param limitSquare only points nearer than its root count
	 * @returns whether there is one
	 */
	closest(x: number, y: number, z: number, limitSquare: number): boolean {
		const { right, first, count, corners, order, points: p, stack, keys } = this;
		this.triangle = -1;
		this.square = limitSquare;
		let top = 0;
		let node = 0;
		if (!(this.boxSquare(0, x, y, z) < limitSquare)) return false;
		for (;;) {
			if (right[node] >= 0) {
				let near = node + 1;
				let far = right[node];
				let nearKey = this.boxSquare(near, x, y, z);
				let farKey = this.boxSquare(far, x, y, z);
				if (farKey < nearKey) {
					const n = near;
					near = far;
					far = n;
					const k = nearKey;
					nearKey = farKey;
					farKey = k;
				}
				if (nearKey < this.square) {
					if (farKey < this.square) {
						stack[top] = far;
						keys[top++] = farKey;
					}
					node = near;
					continue;
				}
			} else {
				const end = first[node] + count[node];
				for (let i = first[node]; i < end; i++) {
					this.nearer(p, 3 * corners[3 * i], 3 * corners[3 * i + 1], 3 * corners[3 * i + 2], order[i], x, y, z);
				}
			}
			do {
				if (top === 0) return this.triangle >= 0;
				top--;
			} while (!(keys[top] < this.square));
			node = stack[top];
		}
	}

	/** Takes the triangle's nearest point when it is nearer (Ericson, Real-Time Collision Detection, 2005, section 5.1.5). */
	private nearer(p: Float64Array, a: number, b: number, c: number, id: number, x: number, y: number, z: number): void {
		const px = x - p[a];
		const py = y - p[a + 1];
		const pz = z - p[a + 2];
		const ux = p[b] - p[a];
		const uy = p[b + 1] - p[a + 1];
		const uz = p[b + 2] - p[a + 2];
		const vx = p[c] - p[a];
		const vy = p[c + 1] - p[a + 1];
		const vz = p[c + 2] - p[a + 2];
		const d1 = ux * px + uy * py + uz * pz;
		const d2 = vx * px + vy * py + vz * pz;
		let s = 0;
		let t = 0;
		if (d1 > 0 || d2 > 0) {
			const uu = ux * ux + uy * uy + uz * uz;
			const uv = ux * vx + uy * vy + uz * vz;
			const vv = vx * vx + vy * vy + vz * vz;
			const d3 = d1 - uu;
			const d4 = d2 - uv;
			const d5 = d1 - uv;
			const d6 = d2 - vv;
			const areaC = d1 * d4 - d3 * d2;
			const areaB = d5 * d2 - d1 * d6;
			const areaA = d3 * d6 - d5 * d4;
			if (d3 >= 0 && d4 <= d3) s = 1;
			else if (d6 >= 0 && d5 <= d6) t = 1;
			else if (areaC <= 0 && d1 >= 0 && d3 <= 0) s = d1 / uu;
			else if (areaB <= 0 && d2 >= 0 && d6 <= 0) t = d2 / vv;
			else if (areaA <= 0 && d4 >= d3 && d5 >= d6) {
				t = (d4 - d3) / (d4 - d3 + (d5 - d6));
				s = 1 - t;
			} else {
				const sum = areaA + areaB + areaC;
				// A triangle without area: its corner stands in, its edges belong to its neighbours too.
				if (sum > 0) {
					s = areaB / sum;
					t = areaC / sum;
				}
			}
		}
		const dx = px - s * ux - t * vx;
		const dy = py - s * uy - t * vy;
		const dz = pz - s * uz - t * vz;
		const square = dx * dx + dy * dy + dz * dz;
		if (square < this.square) {
			this.square = square;
			this.triangle = id;
			this.weightB = s;
			this.weightC = t;
		}
	}

	/**
	 * First triangle that a ray leaves the body through (direction . outward normal > 0) at a distance of (0, limit]: sets
	 * triangle, distance, weightB, weightC. By Moeller and Trumbore, Journal of Graphics Tools 2, 1997.
	 * @param without vertex whose triangles are left out; -1 for none
	 * @param limit in units of the direction
	 */
	leave(x: number, y: number, z: number, dx: number, dy: number, dz: number, limit: number, without: number): boolean {
		const { right, first, count, corners, order, points: p, stack, keys, bounds } = this;
		const own = without < 0 ? UNUSED : this.ranks[without];
		this.triangle = -1;
		this.distance = limit;
		// Never minus infinity for -0: the slab test below counts on it.
		const ix = dx === 0 ? Infinity : 1 / dx;
		const iy = dy === 0 ? Infinity : 1 / dy;
		const iz = dz === 0 ? Infinity : 1 / dz;
		let top = 0;
		stack[top] = 0;
		keys[top++] = 0;
		while (top > 0) {
			top--;
			if (keys[top] > this.distance) continue;
			const node = stack[top];
			if (right[node] < 0) {
				const end = first[node] + count[node];
				for (let i = first[node]; i < end; i++) {
					const va = corners[3 * i];
					const vb = corners[3 * i + 1];
					const vc = corners[3 * i + 2];
					if (va === own || vb === own || vc === own) continue;
					const a = 3 * va;
					const b = 3 * vb;
					const c = 3 * vc;
					const ux = p[b] - p[a];
					const uy = p[b + 1] - p[a + 1];
					const uz = p[b + 2] - p[a + 2];
					const vx = p[c] - p[a];
					const vy = p[c + 1] - p[a + 1];
					const vz = p[c + 2] - p[a + 2];
					const qx = dy * vz - dz * vy;
					const qy = dz * vx - dx * vz;
					const qz = dx * vy - dy * vx;
					// Minus the determinant is direction . (u x v): positive where the ray goes out.
					const det = ux * qx + uy * qy + uz * qz;
					if (!(det < 0)) continue;
					const sx = x - p[a];
					const sy = y - p[a + 1];
					const sz = z - p[a + 2];
					const wb = (sx * qx + sy * qy + sz * qz) / det;
					// A ray through an edge or a corner must not slip between two triangles.
					if (!(wb >= -EDGE && wb <= 1 + EDGE)) continue;
					const rx = sy * uz - sz * uy;
					const ry = sz * ux - sx * uz;
					const rz = sx * uy - sy * ux;
					const wc = (dx * rx + dy * ry + dz * rz) / det;
					if (!(wc >= -EDGE && wb + wc <= 1 + EDGE)) continue;
					const t = (vx * rx + vy * ry + vz * rz) / det;
					if (t > 0 && t <= this.distance) {
						this.distance = t;
						this.triangle = order[i];
						this.weightB = wb;
						this.weightC = wc;
					}
				}
				continue;
			}
			const l = node + 1;
			const r = right[node];
			const lk = enter(bounds, 6 * l, x, y, z, ix, iy, iz, this.distance);
			const rk = enter(bounds, 6 * r, x, y, z, ix, iy, iz, this.distance);
			// The nearer child goes on top.
			if (lk <= rk) {
				if (rk < Infinity) {
					stack[top] = r;
					keys[top++] = rk;
				}
				if (lk < Infinity) {
					stack[top] = l;
					keys[top++] = lk;
				}
			} else {
				if (lk < Infinity) {
					stack[top] = l;
					keys[top++] = lk;
				}
				stack[top] = r;
				keys[top++] = rk;
			}
		}
		return this.triangle >= 0;
	}
}

const EDGE = 1e-9;

/** Where a ray enters a box, or Infinity when it passes it by or enters beyond the limit. */
function enter(
	b: Float64Array,
	o: number,
	x: number,
	y: number,
	z: number,
	ix: number,
	iy: number,
	iz: number,
	limit: number
): number {
	let low = 0;
	let high = limit;
	let s = (b[o] - x) * ix;
	let t = (b[o + 3] - x) * ix;
	// NaN (0 times infinity: the ray runs in the face's plane) fails every comparison and so leaves the bounds as they are.
	if (s > t) {
		const swap = s;
		s = t;
		t = swap;
	}
	if (s > low) low = s;
	if (t < high) high = t;
	s = (b[o + 1] - y) * iy;
	t = (b[o + 4] - y) * iy;
	if (s > t) {
		const swap = s;
		s = t;
		t = swap;
	}
	if (s > low) low = s;
	if (t < high) high = t;
	s = (b[o + 2] - z) * iz;
	t = (b[o + 5] - z) * iz;
	if (s > t) {
		const swap = s;
		s = t;
		t = swap;
	}
	if (s > low) low = s;
	if (t < high) high = t;
	// Wide by some ulps, so that roundoff loses no flat box.
	return low <= high * (1 + 4e-16) ? low : Infinity;
}
