/** Dragging a box by its handles: from the pointer's line of sight to where the box then lies. Pure. */
import {
	alongLine,
	angleAbout,
	axisOf,
	boxAxis,
	boxPoint,
	difference,
	dot,
	dragStep,
	faceMoved,
	onPlane,
	roundTo,
	scaledBy,
	shifted,
	sideOf,
	turned,
	type AxisIndex,
	type FaceName,
	type Placement,
	type Ray
} from '$lib/state/bench-geometry';
import type { Vec3 } from '$lib/workers/display-protocol';

export type Handle = { kind: 'face'; face: FaceName } | { kind: 'centre' } | { kind: 'turn'; axis: AxisIndex };

export interface DragContext {
	/** The picture's axes and metres across a pixel when the drag began. */
	right: Vec3;
	up: Vec3;
	back: Vec3;
	metresPerPixel: number;
	metresPerUnit: number;
}

export interface Modifiers {
	shift: boolean;
	alt: boolean;
}

const DEGREE = Math.PI / 180;
/** Thinnest that a box may be dragged, in picture pixels. */
const LEAST_PX = 6;

/** Where handles stand: faces in their middles, the centre, and for turning the edge nearest to the eye, parallel to the axis. */
export function handlePlace(box: Placement, handle: Handle, eyeSide: Vec3): Vec3 {
	if (handle.kind === 'centre') return [...box.centre];
	const at: Vec3 = [0, 0, 0];
	if (handle.kind === 'face') at[axisOf(handle.face)] = sideOf(handle.face);
	else for (let k = 0; k < 3; k++) if (k !== handle.axis) at[k] = eyeSide[k];
	return boxPoint(box, at);
}

/**
 * Begins a drag of `handle` at line of sight `from`; the result tells where the box lies for a later one. Values keep to round
 * steps; with Alt not. Faces: with Shift both sides. Centre: with Shift along the box's axis nearest to the movement. Turning: in
 * whole degrees, with Shift in steps of fifteen.
 */
export function beginDrag(box: Placement, handle: Handle, place: Vec3, from: Ray, context: DragContext) {
	const step = dragStep(context.metresPerPixel, context.metresPerUnit);
	const keep = (x: number, by: number, { alt }: Modifiers) => (alt ? x : roundTo(x, by));

	if (handle.kind === 'face') {
		const k = axisOf(handle.face);
		const axis = boxAxis(box, k);
		const begun = alongLine(from, place, axis);
		return (ray: Ray, keys: Modifiers): Placement => {
			const out = (alongLine(ray, place, axis) - begun) * sideOf(handle.face);
			if (Number.isNaN(out)) return box;
			// The side's whole length gets the round number, so that what is typed and what is dragged agree.
			const length = 2 * box.halfSize[k];
			const change = keep(length + (keys.shift ? 2 * out : out), step, keys) - length;
			return faceMoved(
				box,
				handle.face,
				keys.shift ? change / 2 : change,
				LEAST_PX * context.metresPerPixel,
				keys.shift
			);
		};
	}
	if (handle.kind === 'centre') {
		const begun = onPlane(from, place, context.back);
		return (ray: Ray, keys: Modifiers): Placement => {
			const now = onPlane(ray, place, context.back);
			if (!now || !begun) return box;
			let by = difference(now, begun);
			if (keys.shift) {
				const axes = ([0, 1, 2] as const).map((k) => boxAxis(box, k));
				const along = axes.reduce((best, a) => (Math.abs(dot(a, by)) > Math.abs(dot(best, by)) ? a : best));
				by = scaledBy(along, alongLine(ray, place, along) - alongLine(from, place, along));
				if (by.some(Number.isNaN)) return box;
			}
			const to = shifted(box, by);
			return { ...to, centre: to.centre.map((x, i) => (by[i] === 0 ? x : keep(x, step, keys))) as Vec3 };
		};
	}
	const axis = boxAxis(box, handle.axis);
	// Seen from the side the ring is a line: then moving along it turns, a radian for the handle's distance from the axis.
	const flat = Math.abs(dot(axis, context.back)) < 0.25;
	const arm = difference(place, box.centre);
	const across: Vec3 = [
		axis[1] * arm[2] - axis[2] * arm[1],
		axis[2] * arm[0] - axis[0] * arm[2],
		axis[0] * arm[1] - axis[1] * arm[0]
	];
	const radius = Math.hypot(...across);
	const begun = flat ? onPlane(from, place, context.back) : onPlane(from, box.centre, axis);
	return (ray: Ray, keys: Modifiers): Placement => {
		const now = flat ? onPlane(ray, place, context.back) : onPlane(ray, box.centre, axis);
		if (!now || !begun || radius === 0) return box;
		const angle = flat
			? dot(difference(now, begun), across) / radius / radius
			: angleAbout(box.centre, axis, begun, now);
		return turned(box, handle.axis, keep(angle, (keys.shift ? 15 : 1) * DEGREE, keys));
	};
}

/** What an arrow key does to a handle: a round step of some pixels, ten times that with Shift; a degree, or fifteen. */
export function nudge(
	box: Placement,
	handle: Handle,
	key: 'ArrowLeft' | 'ArrowRight' | 'ArrowUp' | 'ArrowDown',
	context: DragContext,
	shift: boolean
): Placement {
	const step = 10 * dragStep(context.metresPerPixel, context.metresPerUnit) * (shift ? 10 : 1);
	const sign = key === 'ArrowRight' || key === 'ArrowUp' ? 1 : -1;
	if (handle.kind === 'face') return faceMoved(box, handle.face, sign * step, LEAST_PX * context.metresPerPixel);
	if (handle.kind === 'turn') return turned(box, handle.axis, sign * (shift ? 15 : 1) * DEGREE);
	const wanted = key === 'ArrowLeft' || key === 'ArrowRight' ? context.right : context.up;
	const frame: Vec3[] = [
		[1, 0, 0],
		[0, 1, 0],
		[0, 0, 1]
	];
	const axis = frame.reduce((best, a) => (Math.abs(dot(a, wanted)) > Math.abs(dot(best, wanted)) ? a : best));
	return shifted(box, scaledBy(axis, step * sign * Math.sign(dot(axis, wanted))));
}
