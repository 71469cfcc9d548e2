import { embed } from './box';
import { MorphError } from './errors';
import { helmholtz, solveSparse, type SparseMatrix } from './laplacian';
import type { PlaceRows } from './place-rows';
import { emptyBox, keepOnPlane, type MoveSpace } from './space';
import { mirrorPartners } from './symmetry';
import type { Reduced } from './system';
import type { DesignBox, Surface, SymmetryPlane } from './types';

type Vec3 = [number, number, number];

const SOLVE_TOLERANCE = 1e-10;

/** 0 at 0, 1 from 1 on, with two continuous derivatives. */
const rise = (t: number) => (t >= 1 ? 1 : t <= 0 ? 0 : t * t * t * (10 + t * (6 * t - 15)));

/**
 * How much each vertex inside a box moves: 1 within, falling to 0 at its faces over the distance of the control planes held
 * there (one, where none is).
 * @returns inside.length
 */
function fade(box: DesignBox, uvw: Float64Array): Float64Array {
	const { u0, u1, v0, v1, w0, w1 } = box.held;
	const held = [
		[u0, u1],
		[v0, v1],
		[w0, w1]
	];
	const bands = held.map((pair, d) => pair.map((h) => Math.min(0.5, Math.max(1, h) / (box.lattice[d] - 1))));
	return Float64Array.from({ length: uvw.length / 3 }, (_, i) => {
		let factor = 1;
		for (let d = 0; d < 3; d++) {
			const t = uvw[3 * i + d];
			factor *= rise(t / bands[d][0]) * rise((1 - t) / bands[d][1]);
		}
		return factor;
	});
}

/**
 * Surface mode: dx = w n q, every vertex in the boxes free along its normal n, w fading at the boxes' faces (and at locks), and
 * q with the metric M + r^2 L of the surface inside.
 */
export class SurfaceSpace implements MoveSpace {
	readonly moved: Uint32Array;
	readonly unknowns: number;
	readonly spacing: number;
	readonly insideCounts: number[];
	readonly partners: Int32Array | null;
	/** moved x 3: w n */
	private readonly directions: Float64Array;
	private readonly matrix: SparseMatrix;
	private readonly slot: Int32Array;

	/**
	 * @param weights N in [0, 1] by vertex, or undefined
	 * @param given the first boxes, which must not be empty; later ones are mirror images
	 * @throws MorphError box-empty
	 */
	constructor(
		surface: Surface,
		boxes: DesignBox[],
		given: number,
		smoothing: number,
		weights: Float64Array | undefined,
		mirror: { plane: SymmetryPlane; flags: Uint8Array; normal: Vec3 } | null
	) {
		const { positions, triangles, mass, normals } = surface;
		const count = mass.length;
		const left = new Float64Array(count).fill(1);
		this.insideCounts = boxes.map((box, b) => {
			const { inside, uvw } = embed(positions, box);
			if (inside.length === 0 && b < given) throw emptyBox(box);
			const factors = fade(box, uvw);
			inside.forEach((v, i) => (left[v] *= 1 - factors[i]));
			return inside.length;
		});
		const share = left.map((l, v) => (1 - l) * (weights ? weights[v] : 1));
		const ids: number[] = [];
		share.forEach((w, v) => {
			if (w > 0 && mass[v] > 0) ids.push(v);
		});
		this.moved = Uint32Array.from(ids);
		if (this.moved.length === 0) {
			throw new MorphError(
				'no-free-points',
				'Everything in the design boxes is locked.',
				'Unlock a part of the surface in them, or move the boxes.'
			);
		}
		this.unknowns = this.moved.length;
		this.slot = new Int32Array(count).fill(-1);
		this.moved.forEach((v, i) => (this.slot[v] = i));
		this.directions = new Float64Array(3 * this.moved.length);
		this.moved.forEach((v, i) => {
			for (let d = 0; d < 3; d++) this.directions[3 * i + d] = share[v] * normals[3 * v + d];
		});
		if (mirror) keepOnPlane(this.directions, this.moved, mirror.flags, mirror.normal);
		this.partners = mirror && mirrorPartners(positions, this.moved, mirror.plane);
		this.matrix = helmholtz(
			positions,
			triangles,
			this.slot,
			Float64Array.from(this.moved, (v) => mass[v]),
			smoothing
		);
		this.spacing = smoothing;
	}

	row(gradient: Float64Array): Reduced {
		const { moved, directions } = this;
		const out = new Float64Array(moved.length);
		for (let i = 0; i < moved.length; i++) {
			const v = 3 * moved[i];
			out[i] =
				directions[3 * i] * gradient[v] +
				directions[3 * i + 1] * gradient[v + 1] +
				directions[3 * i + 2] * gradient[v + 2];
		}
		return [out];
	}

	placeRow({ starts, vertices, vectors }: PlaceRows, k: number): Reduced {
		const out = new Float64Array(this.moved.length);
		for (let t = starts[k]; t < starts[k + 1]; t++) {
			const i = this.slot[vertices[t]];
			if (i < 0) continue;
			for (let d = 0; d < 3; d++) out[i] += this.directions[3 * i + d] * vectors[3 * t + d];
		}
		return [out];
	}

	solve([row]: Reduced): Reduced {
		const q = solveSparse(this.matrix, row, SOLVE_TOLERANCE);
		// A symmetric surface in a symmetric metric: what differs is the solver's tolerance.
		this.partners?.forEach((j, i) => {
			if (j > i) q[i] = q[j] = 0.5 * (q[i] + q[j]);
		});
		return [q];
	}

	field([q]: Reduced): Float64Array {
		const out = this.directions.slice();
		for (let i = 0; i < q.length; i++) {
			out[3 * i] *= q[i];
			out[3 * i + 1] *= q[i];
			out[3 * i + 2] *= q[i];
		}
		return out;
	}

	lattices(): Float64Array[] {
		return [];
	}
}
