import { MorphError } from './errors';
import { edgeTable } from './half-edges';
import { checkMesh } from './surface';

/** Triangles that must not move, and the distance over which the surface around them becomes free. */
export interface SurfaceLock {
	/** Ids of the locked triangles. */
	triangles: Uint32Array;
	/** Metres along the surface, >= 0. */
	blend: number;
}

/** Triangles crossed at most when an obtuse corner looks for a support. */
const MAX_UNFOLDED = 64;

/**
 * Weight of each vertex in a move: 0 at every vertex of a locked triangle, 1 from the blend distance on, and between them
 * the smoothstep 6t^5 - 15t^4 + 10t^3 (two continuous derivatives) of t = distance / blend. Several locks multiply.
 * Distances run along the surface, by fast marching on triangles (Kimmel and Sethian, PNAS 95, 1998).
 *
 * @param positions N x 3, metres; borrowed
 * @param triangles F x 3; borrowed
 * @returns N weights in [0, 1]
 * @throws MorphError lock-invalid, mesh-shape, mesh-non-finite
 */
export function lockWeights(positions: Float64Array, triangles: Uint32Array, locks: SurfaceLock[]): Float64Array {
	checkMesh(positions, triangles);
	const faces = triangles.length / 3;
	const weights = new Float64Array(positions.length / 3).fill(1);
	let march: FastMarching | null = null;
	for (const { triangles: locked, blend } of locks) {
		if (!Number.isFinite(blend) || blend < 0) {
			throw new MorphError('lock-invalid', `The blend distance ${blend} is no length.`, 'Give 0 or more metres.');
		}
		const sources = new Uint8Array(weights.length);
		for (let i = 0; i < locked.length; i++) {
			const t = locked[i];
			if (t >= faces) {
				throw new MorphError(
					'lock-invalid',
					`The lock names triangle ${t}, but the surface has only ${faces}.`,
					'Paint the lock again on this surface.',
					{ triangle: t }
				);
			}
			for (let k = 0; k < 3; k++) sources[triangles[3 * t + k]] = 1;
		}
		if (blend === 0) {
			for (let v = 0; v < sources.length; v++) if (sources[v]) weights[v] = 0;
			continue;
		}
		march ??= new FastMarching(positions, triangles);
		const reached = march.run(sources, blend);
		for (let i = 0; i < reached.length; i++) {
			const v = reached[i];
			const t = march.distance[v] / blend;
			// Roundoff may lift the polynomial by an ulp.
			if (t < 1) weights[v] *= Math.min(1, t * t * t * (10 + t * (6 * t - 15)));
		}
	}
	return weights;
}

/**
 * Geodesic distances from a set of vertices up to a limit. First order; an obtuse corner, where the update of a triangle
 * would not be causal, takes its second support from the triangles unfolded beyond the opposite edge (Kimmel and Sethian,
 * section 4), and a vertex without any support the distance along an edge.
 */
export class FastMarching {
	/** Of the last run; Infinity where it did not come. */
	readonly distance: Float64Array;
	private readonly start: Uint32Array;
	/** Corners (3 t + k) by vertex. */
	private readonly corners: Uint32Array;
	private readonly opposite: Int32Array;
	private readonly done: Uint8Array;
	private readonly heap: Uint32Array;
	/** Place in the heap, plus 1; 0: not in it. */
	private readonly slot: Uint32Array;
	private heapSize = 0;
	/** By vertex: corner and neighbour, pairwise, of obtuse corners whose second support it will be. */
	private readonly waiting = new Map<number, number[]>();

	constructor(
		private readonly positions: Float64Array,
		private readonly triangles: Uint32Array
	) {
		const n = positions.length / 3;
		this.distance = new Float64Array(n).fill(Infinity);
		this.done = new Uint8Array(n);
		this.heap = new Uint32Array(n);
		this.slot = new Uint32Array(n);
		this.opposite = edgeTable(triangles, n).opposite;
		this.start = new Uint32Array(n + 1);
		for (let c = 0; c < triangles.length; c++) this.start[triangles[c] + 1]++;
		for (let v = 0; v < n; v++) this.start[v + 1] += this.start[v];
		const fill = this.start.slice(0, n);
		this.corners = new Uint32Array(triangles.length);
		for (let c = 0; c < triangles.length; c++) this.corners[fill[triangles[c]]++] = c;
	}

	/**
	 * @param sources N flags: vertices at the distance 0
	 * @param limit no distance beyond it is sought
	 * @returns the vertices with a distance of at most the limit
	 */
	run(sources: Uint8Array, limit: number): Uint32Array {
		const { distance, done } = this;
		distance.fill(Infinity);
		done.fill(0);
		this.waiting.clear();
		const reached: number[] = [];
		for (let v = 0; v < sources.length; v++) {
			if (!sources[v]) continue;
			distance[v] = 0;
			done[v] = 1;
			reached.push(v);
		}
		const count = reached.length;
		for (let i = 0; i < count; i++) this.spread(reached[i], limit);
		while (this.heapSize > 0) {
			const v = this.pop();
			done[v] = 1;
			reached.push(v);
			this.spread(v, limit);
		}
		return Uint32Array.from(reached);
	}

	/** New estimates at the neighbours of a vertex that has just become final. */
	private spread(v: number, limit: number): void {
		const { triangles } = this;
		for (let i = this.start[v]; i < this.start[v + 1]; i++) {
			const c = this.corners[i];
			const t = c - (c % 3);
			for (let e = 1; e < 3; e++) {
				this.improve(t + ((c + e) % 3), v, triangles[t + ((c + 3 - e) % 3)], limit);
			}
		}
		const list = this.waiting.get(v);
		if (!list) return;
		this.waiting.delete(v);
		for (let i = 0; i < list.length; i += 2) {
			const corner = list[i];
			const t = corner - (corner % 3);
			const other = triangles[t] + triangles[t + 1] + triangles[t + 2] - triangles[corner] - list[i + 1];
			this.improve(corner, list[i + 1], other, limit);
		}
	}

	private improve(corner: number, v: number, other: number, limit: number): void {
		const w = this.triangles[corner];
		if (this.done[w]) return;
		const d = this.estimate(corner, w, v, other);
		if (d < this.distance[w] && d <= limit) {
			this.distance[w] = d;
			this.push(w);
		}
	}

	/** Distance at vertex w (at this corner of its triangle) by the triangle w, v, other, where v is final. */
	private estimate(corner: number, w: number, v: number, other: number): number {
		const { distance, done, positions: p } = this;
		const ux = p[3 * v] - p[3 * w];
		const uy = p[3 * v + 1] - p[3 * w + 1];
		const uz = p[3 * v + 2] - p[3 * w + 2];
		const uu = ux * ux + uy * uy + uz * uz;
		const along = distance[v] + Math.sqrt(uu);
		const x = p[3 * other] - p[3 * w];
		const y = p[3 * other + 1] - p[3 * w + 1];
		const z = p[3 * other + 2] - p[3 * w + 2];
		const uv = ux * x + uy * y + uz * z;
		const vv = x * x + y * y + z * z;
		if (uv >= 0) return done[other] ? Math.min(along, front(uu, uv, vv, distance[v], distance[other])) : along;
		// Obtuse at w: the sector in which a support makes both parts acute.
		return Math.min(along, this.unfolded(corner, v, uu, uv, vv));
	}

	/**
	 * The triangles beyond the edge opposite to the corner are laid flat until a vertex falls into the sector between the
	 * normals to the corner's two edges; that vertex is the second support.
	 */
	private unfolded(corner: number, v: number, uu: number, uv: number, vv: number): number {
		const { distance, done, opposite, triangles, positions: p } = this;
		const t = corner - (corner % 3);
		// Plane coordinates: w at the origin, the corner after w along x.
		const next = triangles[t + ((corner + 1) % 3)];
		const first = next === v;
		const aa = first ? uu : vv;
		const bb = first ? vv : uu;
		const la = Math.sqrt(aa);
		if (la === 0) return Infinity;
		const [ax, ay] = [la, 0];
		const bx = uv / la;
		const by = Math.sqrt(Math.max(0, bb - bx * bx));
		// From the edge's start (sx, sy) to its end (ex, ey), seen from w with the start on the right.
		let [sx, sy, ex, ey] = [ax, ay, bx, by];
		let edge = t + ((corner + 1) % 3);
		for (let n = 0; n < MAX_UNFOLDED; n++) {
			const o = opposite[edge];
			if (o < 0) return Infinity;
			const ot = o - (o % 3);
			const apex = triangles[ot + ((o + 2) % 3)];
			// Edge vector in space and in the plane, and the apex relative to the edge's start.
			const from = 3 * triangles[edge];
			const to = 3 * triangles[edge - (edge % 3) + ((edge + 1) % 3)];
			const gx = p[to] - p[from];
			const gy = p[to + 1] - p[from + 1];
			const gz = p[to + 2] - p[from + 2];
			const hx = p[3 * apex] - p[from];
			const hy = p[3 * apex + 1] - p[from + 1];
			const hz = p[3 * apex + 2] - p[from + 2];
			const gg = gx * gx + gy * gy + gz * gz;
			if (gg === 0) return Infinity;
			const s = (gx * hx + gy * hy + gz * hz) / gg;
			const height = Math.sqrt(Math.max(0, (hx * hx + hy * hy + hz * hz) / gg - s * s));
			// To the right of the edge: away from w.
			const qx = sx + s * (ex - sx) + height * (ey - sy);
			const qy = sy + s * (ey - sy) - height * (ex - sx);
			const rightOk = ax * qx + ay * qy > 0;
			const leftOk = bx * qx + by * qy > 0;
			if (rightOk && leftOk) {
				if (!done[apex]) {
					// Not a neighbour: it would not ask again by itself when its turn comes.
					const list = this.waiting.get(apex);
					if (list) list.push(corner, v);
					else this.waiting.set(apex, [corner, v]);
					return Infinity;
				}
				const along = distance[apex] + Math.sqrt(qx * qx + qy * qy);
				const [mx, my] = first ? [ax, ay] : [bx, by];
				const dot = mx * qx + my * qy;
				return Math.min(along, front(uu, dot, qx * qx + qy * qy, distance[v], distance[apex]));
			}
			// The sector lies on the left of an apex that is too far right, and the other way round.
			const apexIsRight = !leftOk;
			if (apexIsRight) {
				[sx, sy] = [qx, qy];
				edge = ot + ((o + 2) % 3);
			} else {
				[ex, ey] = [qx, qy];
				edge = ot + ((o + 1) % 3);
			}
		}
		return Infinity;
	}

	private push(v: number): void {
		let i = this.slot[v] ? this.slot[v] - 1 : this.heapSize++;
		const { heap, slot, distance } = this;
		while (i > 0) {
			const parent = (i - 1) >> 1;
			const u = heap[parent];
			if (distance[u] <= distance[v]) break;
			heap[i] = u;
			slot[u] = i + 1;
			i = parent;
		}
		heap[i] = v;
		slot[v] = i + 1;
	}

	private pop(): number {
		const { heap, slot, distance } = this;
		const result = heap[0];
		slot[result] = 0;
		const last = heap[--this.heapSize];
		if (this.heapSize > 0) {
			let i = 0;
			for (;;) {
				let child = 2 * i + 1;
				if (child >= this.heapSize) break;
				if (child + 1 < this.heapSize && distance[heap[child + 1]] < distance[heap[child]]) child++;
				if (distance[heap[child]] >= distance[last]) break;
				heap[i] = heap[child];
				slot[heap[i]] = i + 1;
				i = child;
			}
			heap[i] = last;
			slot[last] = i + 1;
		}
		return result;
	}
}

/**
 * Arrival at the origin of a straight front that passed u at `a` and v at `b`, given u.u, u.v, v.v; Infinity where it
 * would come from outside the corner. With the gradient g (|g| = 1) of the distance d: d(u) = d0 + g.u, so that
 * (a - d0, b - d0) Q (a - d0, b - d0)' = 1 for Q the inverse of the Gram matrix.
 */
function front(uu: number, uv: number, vv: number, a: number, b: number): number {
	const det = uu * vv - uv * uv;
	if (!(det > 1e-14 * uu * vv)) return Infinity;
	// Q times det
	const q11 = vv;
	const q12 = -uv;
	const q22 = uu;
	// d0^2 s - 2 d0 m + n = det
	const s = q11 + 2 * q12 + q22;
	const m = q11 * a + q12 * (a + b) + q22 * b;
	const n = q11 * a * a + 2 * q12 * a * b + q22 * b * b;
	const discriminant = m * m - s * (n - det);
	if (!(discriminant >= 0)) return Infinity;
	const d0 = (m + Math.sqrt(discriminant)) / s;
	const alpha = q11 * (a - d0) + q12 * (b - d0);
	const beta = q12 * (a - d0) + q22 * (b - d0);
	// The front comes through the edge between u and v when minus the gradient is a positive mix of u and v.
	return alpha <= 0 && beta <= 0 ? d0 : Infinity;
}
