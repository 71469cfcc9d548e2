/** Geometry of design boxes on the page: axes, faces, dragging, typed angles. Metres, radians unless said; no drawing. */
import { Euler, MathUtils, Matrix4, Quaternion, Vector3 } from 'three';
import type { Plane } from '$lib/api/schemas/common';
import type { Box, BoxCreate, Held, Lock } from '$lib/api/schemas/drawn';
import type { MoveAnswer } from '$lib/api/schemas/moves';
import type { Shape } from '$lib/api/schemas/shapes';
import { controlPoints, mirrorBox, type DesignBox } from '$lib/morph';
import type { DisplayInput, Vec3 } from '$lib/workers/display-protocol';

export type FaceName = keyof Held;
export type AxisIndex = 0 | 1 | 2;
export const faceNames: FaceName[] = ['u0', 'u1', 'v0', 'v1', 'w0', 'w1'];
export const axisOf = (face: FaceName) => 'uvw'.indexOf(face[0]) as AxisIndex;
export const sideOf = (face: FaceName): -1 | 1 => (face[1] === '1' ? 1 : -1);

/** Where a box lies: what dragging changes. */
export type Placement = Pick<Box, 'centre' | 'halfSize' | 'rotation'>;

export interface Ray {
	origin: Vec3;
	/** unit */
	direction: Vec3;
}

const vec = (v: readonly number[]) => new Vector3(v[0], v[1], v[2]);
const list = (v: Vector3): Vec3 => [v.x, v.y, v.z];
/** Without the last bits' noise, which would be stored and shown: 0.289, not 0.28900000000000003. */
const tidy = (v: Vec3): Vec3 => v.map((x) => Number(x.toPrecision(12))) as Vec3;
const quaternion = (q: Placement['rotation']) => new Quaternion(q[0], q[1], q[2], q[3]);

/** The box's own axis `k` in the study's frame, unit. */
export function boxAxis(box: Placement, k: AxisIndex): Vec3 {
	return list(new Vector3().setComponent(k, 1).applyQuaternion(quaternion(box.rotation)));
}

/** A point given in the box's own coordinates, each side at ±1, in the study's frame. */
export function boxPoint(box: Placement, at: Vec3): Vec3 {
	return list(vec(at).multiply(vec(box.halfSize)).applyQuaternion(quaternion(box.rotation)).add(vec(box.centre)));
}

/** From the study's frame into the box's own coordinates, each side at ±1. */
export function boxInverse(box: Placement): Matrix4 {
	return new Matrix4().compose(vec(box.centre), quaternion(box.rotation), vec(box.halfSize)).invert();
}

/** Turned about the frame's fixed axes: first x, then y, then z. Degrees. */
export function toAngles(q: Placement['rotation']): Vec3 {
	const e = new Euler().setFromQuaternion(quaternion(q), 'ZYX');
	const degrees = (r: number) => Number(MathUtils.radToDeg(r).toFixed(6)) + 0;
	return [degrees(e.x), degrees(e.y), degrees(e.z)];
}

export function fromAngles(angles: Vec3): Placement['rotation'] {
	const [x, y, z] = angles.map(MathUtils.degToRad);
	return unit(new Quaternion().setFromEuler(new Euler(x, y, z, 'ZYX')));
}

function unit(q: Quaternion): Placement['rotation'] {
	q.normalize();
	return [q.x, q.y, q.z, q.w];
}

/** Turned by `angle` about its own axis `k`. */
export function turned(box: Placement, k: AxisIndex, angle: number): Placement {
	const turn = new Quaternion().setFromAxisAngle(vec(boxAxis(box, k)), angle);
	return { ...pick(box), rotation: unit(turn.multiply(quaternion(box.rotation))) };
}

/**
 * One face pushed out by `by` metres (negative: in) with the face opposite where it is; `both`: that one likewise, outward.
 * A side gets no shorter than `least`.
 */
export function faceMoved(box: Placement, face: FaceName, by: number, least: number, both = false): Placement {
	const k = axisOf(face);
	const half = box.halfSize[k];
	const change = Math.max(both ? by : by / 2, least / 2 - half);
	const halfSize = [...box.halfSize] as Vec3;
	halfSize[k] = half + change;
	const shift = both ? 0 : change * sideOf(face);
	const centre = list(vec(box.centre).addScaledVector(vec(boxAxis(box, k)), shift));
	return { centre: tidy(centre), halfSize: tidy(halfSize), rotation: box.rotation };
}

export function shifted(box: Placement, by: Vec3): Placement {
	return { ...pick(box), centre: tidy(list(vec(box.centre).add(vec(by)))) };
}

const pick = ({ centre, halfSize, rotation }: Placement): Placement => ({ centre, halfSize, rotation });

/** Place along the line `point + t axis` that is nearest to the ray: t. NaN when they are parallel. */
export function alongLine(ray: Ray, point: Vec3, axis: Vec3): number {
	const d = vec(ray.direction);
	const a = vec(axis);
	const w = vec(point).sub(vec(ray.origin));
	const b = a.dot(d);
	const denominator = 1 - b * b;
	return denominator < 1e-4 ? NaN : (b * w.dot(d) - w.dot(a)) / denominator;
}

/** Where the ray meets the plane through `point` with `normal`; null when it does not. */
export function onPlane(ray: Ray, point: Vec3, normal: Vec3): Vec3 | null {
	const n = vec(normal);
	const slope = n.dot(vec(ray.direction));
	if (Math.abs(slope) < 1e-6) return null;
	const t = n.dot(vec(point).sub(vec(ray.origin))) / slope;
	return list(vec(ray.origin).addScaledVector(vec(ray.direction), t));
}

/** Signed angle from `from` to `to` about `axis` through `centre`. */
export function angleAbout(centre: Vec3, axis: Vec3, from: Vec3, to: Vec3): number {
	const n = vec(axis);
	const flat = (p: Vec3) => vec(p).sub(vec(centre)).projectOnPlane(n);
	const a = flat(from);
	const b = flat(to);
	return Math.atan2(n.dot(new Vector3().crossVectors(a, b)), a.dot(b));
}

export const difference = (a: Vec3, b: Vec3): Vec3 => [a[0] - b[0], a[1] - b[1], a[2] - b[2]];
export const dot = (a: Vec3, b: Vec3) => a[0] * b[0] + a[1] * b[1] + a[2] * b[2];
export const scaledBy = (a: Vec3, s: number): Vec3 => [a[0] * s, a[1] * s, a[2] * s];

/** The step that dragging keeps to: the round decimal in the study's unit that is finer than a pixel. */
export function dragStep(metresPerPixel: number, metresPerUnit: number): number {
	return 10 ** Math.floor(Math.log10(metresPerPixel / metresPerUnit)) * metresPerUnit;
}

export const roundTo = (x: number, step: number) => Number((Math.round(x / step) * step).toPrecision(12));

/** Control points held by the faces' planes: 1 held, 0 free; ((i nv) + j) nw + k. */
export function heldPoints(lattice: readonly number[], held: Held): Uint8Array {
	const [nu, nv, nw] = lattice;
	const out = new Uint8Array(nu * nv * nw);
	const fixed = (i: number, n: number, low: number, high: number) => i < low || i >= n - high;
	for (let i = 0, p = 0; i < nu; i++)
		for (let j = 0; j < nv; j++)
			for (let k = 0; k < nw; k++, p++)
				out[p] =
					fixed(i, nu, held.u0, held.u1) || fixed(j, nv, held.v0, held.v1) || fixed(k, nw, held.w0, held.w1) ? 1 : 0;
	return out;
}

/** The engine's box: what the wire's box says, without what only the server needs. */
export function designBox(box: BoxCreate & { id: string }): DesignBox {
	const { id, name, centre, halfSize, lattice, degree } = box;
	return {
		id,
		name,
		centre: [...centre] as Vec3,
		halfSize: [...halfSize] as Vec3,
		rotation: [...(box.rotation ?? [0, 0, 0, 1])] as DesignBox['rotation'],
		lattice: [...lattice] as Vec3,
		basis: box.basis ?? 'bernstein',
		...(degree === undefined ? {} : { degree }),
		held: { ...box.held },
		heldPoints: [...(box.heldPoints ?? [])],
		axes: [...box.axes],
		frame: box.frame
	};
}

/** The lattice at rest, as the engine has it: nPoints x 3, metres, u slowest, w fastest. */
export const restPoints = (box: BoxCreate & { id: string }) => Float32Array.from(controlPoints(designBox(box)));

const fromBase64 = (text: string): ArrayBuffer => Uint8Array.from(atob(text), (c) => c.charCodeAt(0)).buffer;

/**
 * What the display worker needs to show a move: the boxes (and their mirror images) with their lattices' displacements, or the
 * displacement by vertex where the lattices do not give it.
 */
export function shownMove(
	{ lattices, field }: MoveAnswer,
	boxes: Box[],
	symmetry: Plane | null
): Omit<DisplayInput<'move'>, 'exaggeration'> {
	const known = lattices.flatMap(({ boxId, mirrored, displacement }) => {
		const box = boxes.find((b) => b.id === boxId);
		if (!box) return [];
		const own = designBox(box);
		return [
			{ box: mirrored && symmetry ? mirrorBox(own, symmetry).box : own, lattice: Float64Array.from(displacement) }
		];
	});
	return {
		boxes: known.map((k) => k.box),
		lattices: known.map((k) => k.lattice),
		field: field && {
			vertices: new Uint32Array(fromBase64(field.vertices)),
			displacement: new Float32Array(fromBase64(field.displacement))
		}
	};
}

/** The triangles that locks leave alone on a shape, ascending. */
export function lockedTriangles(locks: Lock[], { patches, topologyId }: Shape): Uint32Array {
	const locked = new Set<number>();
	const add = (first: number, count: number) => {
		for (let t = first; t < first + count; t++) locked.add(t);
	};
	for (const lock of locks) {
		for (const patch of patches) if (lock.patches.includes(patch.name)) add(patch.firstTriangle, patch.triangleCount);
		if (lock.painted?.topologyId !== topologyId) continue;
		const { ranges } = lock.painted;
		for (let i = 0; i + 1 < ranges.length; i += 2) add(ranges[i], ranges[i + 1]);
	}
	return Uint32Array.from(locked).sort();
}

/** Ascending triangles as runs: first, count, first, count. */
export function runsOf(triangles: Iterable<number>): number[] {
	const ranges: number[] = [];
	for (const t of triangles) {
		const last = ranges.length - 2;
		if (last >= 0 && ranges[last] + ranges[last + 1] === t) ranges[last + 1]++;
		else ranges.push(t, 1);
	}
	return ranges;
}
