import type { Surface } from './types';

/** Triangles with at least one marked vertex, ascending. */
export function touchedTriangles(triangles: Uint32Array, moved: Uint32Array, vertexCount: number): Uint32Array {
	const mark = new Uint8Array(vertexCount);
	for (let i = 0; i < moved.length; i++) mark[moved[i]] = 1;
	const out = new Uint32Array(triangles.length / 3);
	let count = 0;
	for (let t = 0; t < out.length; t++) {
		if (mark[triangles[3 * t]] | mark[triangles[3 * t + 1]] | mark[triangles[3 * t + 2]]) out[count++] = t;
	}
	return out.slice(0, count);
}

/** Change of volume under x + d + t e as the cubic in t that it is: [c0, c1, c2, c3]. */
export type VolumeCubic = [number, number, number, number];

const det = (
	ax: number,
	ay: number,
	az: number,
	bx: number,
	by: number,
	bz: number,
	cx: number,
	cy: number,
	cz: number
): number => ax * (by * cz - bz * cy) + ay * (bz * cx - bx * cz) + az * (bx * cy - by * cx);

/** Exact volume changes of a surface, over the triangles that move only. */
export class VolumeChange {
	private readonly touched: Uint32Array;
	private readonly centre: [number, number, number];
	/** Position of each vertex among the moved ones plus one; 0 for the others. */
	private readonly slot: Uint32Array;

	constructor(
		private readonly surface: Pick<Surface, 'positions' | 'triangles' | 'origin'>,
		moved: Uint32Array
	) {
		const n = surface.positions.length / 3;
		this.touched = touchedTriangles(surface.triangles, moved, n);
		this.centre = surface.origin;
		this.slot = new Uint32Array(n);
		for (let i = 0; i < moved.length; i++) this.slot[moved[i]] = i + 1;
	}

	/**
	 * V(x + d + t e) - V(x) for every t.
	 * @param displacement d, moved x 3
	 * @param correction e, moved x 3, or null when only t = 0 is asked
	 */
	cubic(displacement: Float64Array, correction: Float64Array | null): VolumeCubic {
		const { positions, triangles } = this.surface;
		const { touched, slot } = this;
		const [ox, oy, oz] = this.centre;
		const x = new Float64Array(9);
		const y = new Float64Array(9);
		const e = new Float64Array(9);
		let c0 = 0;
		let c1 = 0;
		let c2 = 0;
		let c3 = 0;
		for (let k = 0; k < touched.length; k++) {
			const t = 3 * touched[k];
			for (let j = 0; j < 3; j++) {
				const v = triangles[t + j];
				x[3 * j] = positions[3 * v] - ox;
				x[3 * j + 1] = positions[3 * v + 1] - oy;
				x[3 * j + 2] = positions[3 * v + 2] - oz;
				const s = 3 * (slot[v] - 1);
				for (let d = 0; d < 3; d++) {
					y[3 * j + d] = s < 0 ? x[3 * j + d] : x[3 * j + d] + displacement[s + d];
					e[3 * j + d] = s < 0 || !correction ? 0 : correction[s + d];
				}
			}
			const before = det(x[0], x[1], x[2], x[3], x[4], x[5], x[6], x[7], x[8]);
			c0 += det(y[0], y[1], y[2], y[3], y[4], y[5], y[6], y[7], y[8]) - before;
			if (correction) {
				c1 +=
					det(e[0], e[1], e[2], y[3], y[4], y[5], y[6], y[7], y[8]) +
					det(y[0], y[1], y[2], e[3], e[4], e[5], y[6], y[7], y[8]) +
					det(y[0], y[1], y[2], y[3], y[4], y[5], e[6], e[7], e[8]);
				c2 +=
					det(e[0], e[1], e[2], e[3], e[4], e[5], y[6], y[7], y[8]) +
					det(e[0], e[1], e[2], y[3], y[4], y[5], e[6], e[7], e[8]) +
					det(y[0], y[1], y[2], e[3], e[4], e[5], e[6], e[7], e[8]);
				c3 += det(e[0], e[1], e[2], e[3], e[4], e[5], e[6], e[7], e[8]);
			}
		}
		return [c0 / 6, c1 / 6, c2 / 6, c3 / 6];
	}
}

/** The root of c0 + c1 t + c2 t^2 + c3 t^3 = target next to t = 0 by Newton's method; null when it does not settle. */
export function nearRoot([c0, c1, c2, c3]: VolumeCubic, target: number): number | null {
	let t = 0;
	for (let k = 0; k < 30; k++) {
		const value = c0 + t * (c1 + t * (c2 + t * c3)) - target;
		const slope = c1 + t * (2 * c2 + t * 3 * c3);
		if (!(Math.abs(slope) > 0)) return null;
		const step = value / slope;
		t -= step;
		if (!Number.isFinite(t)) return null;
		if (Math.abs(step) <= 1e-15 * Math.abs(t)) return t;
	}
	return t;
}
