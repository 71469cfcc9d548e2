import { MorphError } from './errors';
import { PlaceRowsBuilder, type PlaceConstraint } from './place-rows';
import { TriangleTree } from './triangle-tree';
import type { Surface } from './types';
import { VertexNormals } from './vertex-normals';

export interface ThicknessOptions {
	/**
	 * What is asked of a place that is thinner than the least thickness before the move (the wedge at a trailing edge always
	 * is): 'hold', the default, that it becomes no thinner than it is; 'thicken', that it reaches the least thickness.
	 */
	thin?: 'hold' | 'thicken';
}

export interface PreparedThickness {
	/** Metres. */
	readonly least: number;
	/** Thickness >= least at these vertices, or as `thin` says. */
	place(vertices: Uint32Array): PlaceConstraint;
	/**
	 * Thickness of the wall under vertices at any positions of the same surface.
	 * @param positions N x 3, metres; borrowed
	 * @param reach metres beyond which nothing is looked for; default Infinity
	 * @returns one number per vertex, metres; Infinity where the ray meets no opposite wall within reach
	 */
	thickness(positions: Float64Array, vertices: Uint32Array, reach?: number): Float64Array;
}

/**
 * Wall thickness by inward rays: from each vertex against its area-weighted normal to the first triangle through which
 * the ray leaves the body. With the direction d kept, the hit point h on a triangle with the outward normal m, and the
 * barycentric weights of h at its corners,
 *
 *   t = (h - x) . m / (d . m),   dt = (sum of weight . dx_corner - dx) . m / (d . m)
 *
 * exactly to first order, since the hit point stays in the triangle's plane. The turning of d itself with the surface is
 * left out of the row; it is seen in the next round, whose rays start anew.
 *
 * A wall that was pushed through its opposite wall shows no thickness to a ray. So each vertex remembers the triangle that
 * it faced before the move, and where it has passed that triangle's plane the (negative) distance to it counts.
 *
 * @param surface in metres; borrowed and kept
 * @param least metres, > 0
 * @throws MorphError thickness-invalid
 */
export function prepareThickness(surface: Surface, least: number, options: ThicknessOptions = {}): PreparedThickness {
	if (!Number.isFinite(least) || least <= 0) {
		throw new MorphError('thickness-invalid', `The thickness ${least} is no wall.`, 'Give more than 0 metres.');
	}
	return new Thickness(surface, least, options.thin ?? 'hold');
}

const UNKNOWN = -2;
const NOTHING = -1;

class Thickness implements PreparedThickness {
	private readonly tree: TriangleTree;
	/** By vertex: the triangle that it faces before the move, where in it, and how far. */
	private readonly faced: Int32Array;
	private readonly weights: Float64Array;
	private readonly before: Float64Array;

	constructor(
		private readonly surface: Surface,
		readonly least: number,
		private readonly thin: 'hold' | 'thicken'
	) {
		const n = surface.positions.length / 3;
		this.tree = new TriangleTree(surface.positions, surface.triangles);
		this.faced = new Int32Array(n).fill(UNKNOWN);
		this.weights = new Float64Array(2 * n);
		this.before = new Float64Array(n);
	}

	thickness(positions: Float64Array, vertices: Uint32Array, reach = Infinity): Float64Array {
		const { tree } = this;
		const normals = new VertexNormals(this.surface.triangles, vertices, positions.length / 3);
		normals.update(positions);
		tree.refit(positions);
		const n = normals.normals;
		const p = positions;
		return Float64Array.from(vertices, (id) => {
			const v = 3 * id;
			return tree.leave(p[v], p[v + 1], p[v + 2], -n[v], -n[v + 1], -n[v + 2], reach, id) ? tree.distance : Infinity;
		});
	}

	/** What the vertices face before the move, where that is not known yet. */
	private look(vertices: Uint32Array, normals: VertexNormals): void {
		const { tree, faced, weights, before } = this;
		const p = this.surface.positions;
		const n = normals.normals;
		if (vertices.every((v) => faced[v] !== UNKNOWN)) return;
		normals.update(p);
		tree.refit(p);
		for (let i = 0; i < vertices.length; i++) {
			const id = vertices[i];
			if (faced[id] !== UNKNOWN) continue;
			const v = 3 * id;
			faced[id] = NOTHING;
			before[id] = Infinity;
			if (n[v] === 0 && n[v + 1] === 0 && n[v + 2] === 0) continue;
			if (!tree.leave(p[v], p[v + 1], p[v + 2], -n[v], -n[v + 1], -n[v + 2], Infinity, id)) continue;
			faced[id] = tree.triangle;
			weights[2 * id] = tree.weightB;
			weights[2 * id + 1] = tree.weightC;
			before[id] = tree.distance;
		}
	}

	place(vertices: Uint32Array): PlaceConstraint {
		const { tree, surface, least, faced, weights, before, thin } = this;
		const { triangles } = surface;
		const { ranks } = tree;
		// Neighbours one after the other, which caches like.
		const sorted = vertices.slice().sort((a, b) => ranks[a] - ranks[b]);
		const normals = new VertexNormals(triangles, sorted, surface.positions.length / 3);
		const n = normals.normals;
		this.look(sorted, normals);
		return {
			rows: (p, within) => {
				const builder = new PlaceRowsBuilder();
				normals.update(p);
				// Before the move every answer is at hand.
				const unmoved = p === surface.positions;
				if (!unmoved) tree.refit(p);
				for (let i = 0; i < sorted.length; i++) {
					const id = sorted[i];
					const v = 3 * id;
					const dx = -n[v];
					const dy = -n[v + 1];
					const dz = -n[v + 2];
					if (dx === 0 && dy === 0 && dz === 0) continue;
					const limit = thin === 'hold' && before[id] < least ? before[id] : least;
					let t = 3 * faced[id];
					let wb = weights[2 * id];
					let wc = weights[2 * id + 1];
					let value = unmoved ? before[id] : Infinity;
					if (!unmoved && t >= 0) value = row(null, p, triangles, t, wb, wc, id, dx, dy, dz);
					// Past the plane that it faced, the distance to that plane counts; else what the ray finds now.
					if (!unmoved && !(value <= 0)) {
						if (!tree.leave(p[v], p[v + 1], p[v + 2], dx, dy, dz, limit + within, id)) continue;
						value = tree.distance;
						t = 3 * tree.triangle;
						wb = tree.weightB;
						wc = tree.weightC;
					}
					if (!(value < limit + within)) continue;
					row(builder, p, triangles, t, wb, wc, id, dx, dy, dz);
					builder.place(value - limit, value);
				}
				return builder.rows();
			}
		};
	}
}

/**
 * Distance along d from vertex `id` to the plane of the triangle at offset t (Infinity when d runs along it), and, with a
 * builder, the terms of its change.
 */
function row(
	builder: PlaceRowsBuilder | null,
	p: Float64Array,
	triangles: Uint32Array,
	t: number,
	wb: number,
	wc: number,
	id: number,
	dx: number,
	dy: number,
	dz: number
): number {
	const [ia, ib, ic] = [triangles[t], triangles[t + 1], triangles[t + 2]];
	const [a, b, c] = [3 * ia, 3 * ib, 3 * ic];
	const ux = p[b] - p[a];
	const uy = p[b + 1] - p[a + 1];
	const uz = p[b + 2] - p[a + 2];
	const vx = p[c] - p[a];
	const vy = p[c + 1] - p[a + 1];
	const vz = p[c + 2] - p[a + 2];
	let mx = uy * vz - uz * vy;
	let my = uz * vx - ux * vz;
	let mz = ux * vy - uy * vx;
	const across = dx * mx + dy * my + dz * mz;
	if (!(across > 0)) return Infinity;
	mx /= across;
	my /= across;
	mz /= across;
	if (builder) {
		const wa = 1 - wb - wc;
		builder.term(id, -mx, -my, -mz);
		builder.term(ia, wa * mx, wa * my, wa * mz);
		builder.term(ib, wb * mx, wb * my, wb * mz);
		builder.term(ic, wc * mx, wc * my, wc * mz);
	}
	return (p[a] - p[3 * id]) * mx + (p[a + 1] - p[3 * id + 1]) * my + (p[a + 2] - p[3 * id + 2]) * mz;
}
