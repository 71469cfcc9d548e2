import { boxBases } from './basis';
import { MorphError } from './errors';
import type { Axis, DesignBox, Embedding, WithCheckpoint } from './types';

export const MIN_POINTS = 2;
export const MAX_POINTS = 20;
export const MAX_LATTICE = 4000;
const MAX_HELD = 3;
const MAX_BSPLINE_DEGREE = 3;
const AXES: readonly Axis[] = ['x', 'y', 'z'];
const FACES = [
	['u0', 'u1'],
	['v0', 'v1'],
	['w0', 'w1']
] as const;

/** Index of a control point: u slowest, w fastest. */
export function pointIndex(lattice: readonly [number, number, number], i: number, j: number, k: number): number {
	return (i * lattice[1] + j) * lattice[2] + k;
}

/** Columns of the box's rotation, 9 numbers: axis u, axis v, axis w in world coordinates. */
export function boxAxes(box: { readonly rotation: readonly [number, number, number, number] }): Float64Array {
	const [x, y, z, w] = box.rotation;
	const s = 2 / (x * x + y * y + z * z + w * w);
	return Float64Array.of(
		1 - s * (y * y + z * z),
		s * (x * y + w * z),
		s * (x * z - w * y),
		s * (x * y - w * z),
		1 - s * (x * x + z * z),
		s * (y * z + w * x),
		s * (x * z + w * y),
		s * (y * z - w * x),
		1 - s * (x * x + y * y)
	);
}

/**
 * Refuses a box that makes no sense, naming what is wrong.
 * @throws MorphError box-invalid, no-free-points
 */
export function checkBox(box: DesignBox): void {
	const label = box.name ?? box.id;
	const refuse = (message: string, mend: string): never => {
		throw new MorphError('box-invalid', `Design box "${label}": ${message}`, mend, { box: label });
	};
	const numbers = [...box.centre, ...box.halfSize, ...box.rotation];
	if (
		box.centre.length !== 3 ||
		box.halfSize.length !== 3 ||
		box.rotation.length !== 4 ||
		!numbers.every(Number.isFinite)
	) {
		refuse('centre, half-size or rotation is not a list of finite numbers.', 'Give 3, 3 and 4 finite numbers.');
	}
	if (box.halfSize.some((h) => h <= 0)) refuse('a half-size is not positive.', 'Give half-sizes above 0.');
	const q = Math.hypot(...box.rotation);
	if (Math.abs(q - 1) > 1e-3) {
		refuse(`the rotation has length ${q.toPrecision(4)}.`, 'Give a unit quaternion [x, y, z, w].');
	}
	if (box.lattice.length !== 3 || box.lattice.some((n) => !Number.isInteger(n) || n < MIN_POINTS || n > MAX_POINTS)) {
		refuse(`the lattice ${box.lattice.join(' x ')} is out of range.`, 'Give 2 to 20 points along each axis.');
	}
	if (box.lattice[0] * box.lattice[1] * box.lattice[2] > MAX_LATTICE) {
		refuse(`the lattice ${box.lattice.join(' x ')} has more than 4000 points.`, 'Give at most 4000 points in all.');
	}
	if (box.basis !== 'bernstein' && box.basis !== 'bspline') {
		refuse(`basis "${String(box.basis)}" is unknown.`, 'Give "bernstein" or "bspline".');
	}
	if (box.basis === 'bspline') {
		const degree = box.degree ?? MAX_BSPLINE_DEGREE;
		if (!Number.isInteger(degree) || degree < 1 || degree > MAX_BSPLINE_DEGREE) {
			refuse(`B-spline degree ${degree} is out of range.`, 'Give a degree of 1, 2 or 3.');
		}
		if (box.lattice.some((n) => n <= degree)) {
			refuse(
				`a B-spline of degree ${degree} needs more points than its degree along each axis.`,
				`Give at least ${degree + 1} points along each axis, or a lower degree.`
			);
		}
	}
	for (const pair of FACES) {
		for (const face of pair) {
			const held = box.held[face];
			if (!Number.isInteger(held) || held < 0 || held > MAX_HELD) {
				refuse(`${held} held planes at face ${face} are out of range.`, 'Give 0, 1, 2 or 3 held planes.');
			}
		}
	}
	const points = box.lattice[0] * box.lattice[1] * box.lattice[2];
	const stray = box.heldPoints?.find((p) => !Number.isInteger(p) || p < 0 || p >= points);
	if (stray !== undefined) {
		refuse(`held point ${stray} is not in the lattice.`, `Give indices from 0 to ${points - 1}.`);
	}
	if (new Set(box.axes).size !== box.axes.length || box.axes.some((a) => !AXES.includes(a))) {
		refuse(`the axes ${box.axes.join(', ')} are not a choice of x, y, z.`, 'Give each axis at most once.');
	}
	if (box.frame !== 'box' && box.frame !== 'world') refuse('the frame is unknown.', 'Give "box" or "world".');
	if (box.axes.length === 0 || freePoints(box).length === 0) {
		throw new MorphError(
			'no-free-points',
			`Design box "${label}": no control point may move.`,
			box.axes.length === 0
				? 'Allow at least one axis.'
				: 'Hold fewer planes or points, or add control points: along every axis at least one plane must stay free.',
			{ box: label }
		);
	}
}

/** Indices of the control points that are not held, ascending. */
export function freePoints(box: DesignBox): Uint32Array {
	const out: number[] = [];
	const [nu, nv, nw] = box.lattice;
	const { u0, u1, v0, v1, w0, w1 } = box.held;
	const byHand = new Set(box.heldPoints);
	for (let i = u0; i < nu - u1; i++) {
		for (let j = v0; j < nv - v1; j++) {
			for (let k = w0; k < nw - w1; k++) {
				const p = pointIndex(box.lattice, i, j, k);
				if (!byHand.has(p)) out.push(p);
			}
		}
	}
	return Uint32Array.from(out);
}

/** Unit directions in world coordinates along which the box's control points may move. */
export function boxDirections(box: DesignBox): [number, number, number][] {
	const columns = box.frame === 'box' ? boxAxes(box) : Float64Array.of(1, 0, 0, 0, 1, 0, 0, 0, 1);
	return AXES.filter((a) => box.axes.includes(a)).map((a) => {
		const c = 3 * AXES.indexOf(a);
		return [columns[c], columns[c + 1], columns[c + 2]];
	});
}

/**
 * Rest positions of the control points (Greville abscissae, so that an affine lattice gives an affine map).
 * @returns nPoints x 3, metres, world; ((i*nv)+j)*nw+k
 */
export function controlPoints(box: DesignBox): Float64Array {
	const axes = boxAxes(box);
	const [gu, gv, gw] = boxBases(box).map((b) => b.greville);
	const [nu, nv, nw] = box.lattice;
	const out = new Float64Array(3 * nu * nv * nw);
	let at = 0;
	for (let i = 0; i < nu; i++) {
		for (let j = 0; j < nv; j++) {
			for (let k = 0; k < nw; k++) {
				const a = (2 * gu[i] - 1) * box.halfSize[0];
				const b = (2 * gv[j] - 1) * box.halfSize[1];
				const c = (2 * gw[k] - 1) * box.halfSize[2];
				for (let d = 0; d < 3; d++) out[at++] = box.centre[d] + a * axes[d] + b * axes[3 + d] + c * axes[6 + d];
			}
		}
	}
	return out;
}

/**
 * The vertices inside the box (faces included) and their coordinates in it.
 * @param positions N x 3, metres, borrowed
 */
export function embed(positions: Float64Array, box: DesignBox, options: WithCheckpoint = {}): Embedding {
	const axes = boxAxes(box);
	const aligned = box.rotation[0] === 0 && box.rotation[1] === 0 && box.rotation[2] === 0;
	const [cx, cy, cz] = box.centre;
	const [hu, hv, hw] = box.halfSize;
	const n = positions.length / 3;
	let ids = new Uint32Array(Math.min(n, 1024));
	let uvw = new Float64Array(3 * ids.length);
	let count = 0;
	const [a0, a1, a2, b0, b1, b2, c0, c1, c2] = axes;
	for (let v = 0; v < n; v++) {
		const x = positions[3 * v];
		const y = positions[3 * v + 1];
		const z = positions[3 * v + 2];
		let u, w, t;
		if (aligned) {
			// Written as the distance from the lower corner, so that a vertex on a face is inside to the last bit.
			u = (x - (cx - hu)) / (2 * hu);
			t = (y - (cy - hv)) / (2 * hv);
			w = (z - (cz - hw)) / (2 * hw);
		} else {
			const dx = x - cx;
			const dy = y - cy;
			const dz = z - cz;
			u = 0.5 + (dx * a0 + dy * a1 + dz * a2) / (2 * hu);
			t = 0.5 + (dx * b0 + dy * b1 + dz * b2) / (2 * hv);
			w = 0.5 + (dx * c0 + dy * c1 + dz * c2) / (2 * hw);
		}
		if (u < 0 || u > 1 || t < 0 || t > 1 || w < 0 || w > 1) continue;
		if (count === ids.length) {
			const size = Math.min(n, 2 * count);
			const grownIds = new Uint32Array(size);
			grownIds.set(ids);
			ids = grownIds;
			const grown = new Float64Array(3 * size);
			grown.set(uvw);
			uvw = grown;
		}
		ids[count] = v;
		uvw[3 * count] = u;
		uvw[3 * count + 1] = t;
		uvw[3 * count + 2] = w;
		count++;
	}
	options.checkpoint?.(1);
	return { inside: ids.slice(0, count), uvw: uvw.slice(0, 3 * count) };
}
