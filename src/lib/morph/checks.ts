import type { PreparedKeepOut } from './keep-out';
import { checkKeepOuts, checkRadius, checkThickness, type MovedSurface } from './place-checks';
import { selfIntersections } from './self-intersection';
import type { PreparedThickness } from './thickness';
import type { TriangleTree } from './triangle-tree';
import type { CheckResult, MoveChecks, WithCheckpoint } from './types';

export interface CheckMoveInput extends WithCheckpoint {
	/** N x 3 of the parent, any unit; borrowed. */
	before: ArrayLike<number>;
	/** N x 3 of the child, same unit; borrowed. */
	after: ArrayLike<number>;
	/** F x 3 */
	triangles: Uint32Array;
	/** Look only at triangles with a vertex among these; default all. */
	moved?: Uint32Array;
	/** Degrees; default 3 (common practice for surface meshes of flow solvers). */
	minAngle?: number;
	/** Whether breaking the smallest angle blocks the commit; default false. */
	minAngleHard?: boolean;
	/** Metres per unit of the positions, for the places; default 1. */
	metresPerUnit?: number;
	/** Smallest and largest area of a moved triangle over the parent's; left out: not looked at. */
	areaRatio?: { least: number; most: number };
	/** New crossings of moved triangles with any others; left out: not looked for. */
	selfIntersection?: {
		/** Over the triangles at about these positions, in the unit of the positions; it is refitted. */
		tree?: TriangleTree;
	};
	/** Wall thickness (metres), at the vertices meant, default all that moved. */
	thickness?: { prepared: PreparedThickness; vertices?: Uint32Array }[];
	/** Keep-outs and envelopes (metres). */
	keepOuts?: { label: string; prepared: PreparedKeepOut }[];
	/** Smallest radius of convex curvature; with a limit (metres) it is hard. */
	radius?: { limit?: number };
}

const DEFAULT_MIN_ANGLE = 3;

/** Common practice for surface meshes that are moved and not made anew: no triangle below a quarter or above four times its area. */
export const USUAL_AREA_RATIO = { least: 0.25, most: 4 } as const;
/**
 * Metres. UN Regulation No. 26 (external projections of cars, category M1; parts that a 100 mm sphere can touch) is the usual
 * reference. Whether it, and which of its exceptions, applies is for the local codes and licensed practice.
 */
export const USUAL_LEAST_RADIUS = 0.0025;

/**
 * Looks at the moved triangles, and at what else is asked for: those that flipped (normal turned by 90 degrees or more against the parent) and the
 * smallest interior angle. Triangles without area in the parent are left out: they have neither normal nor angles.
 */
export function checkMove(input: CheckMoveInput): MoveChecks {
	const { before, after, triangles, moved } = input;
	let mark: Uint8Array | null = null;
	if (moved) {
		mark = new Uint8Array(before.length / 3);
		for (let i = 0; i < moved.length; i++) mark[moved[i]] = 1;
	}
	const limit = input.minAngle ?? DEFAULT_MIN_ANGLE;
	const limitCosine = Math.cos((limit * Math.PI) / 180);
	let flipped = 0;
	let worstTurn = Infinity;
	let worstFlip = -1;
	let largestCosine = -Infinity;
	let worstAngle = -1;
	let narrow = 0;
	for (let i = 0; i < triangles.length; i += 3) {
		const va = triangles[i];
		const vb = triangles[i + 1];
		const vc = triangles[i + 2];
		if (mark && !(mark[va] | mark[vb] | mark[vc])) continue;
		const a = 3 * va;
		const b = 3 * vb;
		const c = 3 * vc;
		// Edges a->b, a->c before the move.
		const px = before[b] - before[a];
		const py = before[b + 1] - before[a + 1];
		const pz = before[b + 2] - before[a + 2];
		const qx = before[c] - before[a];
		const qy = before[c + 1] - before[a + 1];
		const qz = before[c + 2] - before[a + 2];
		const nx = py * qz - pz * qy;
		const ny = pz * qx - px * qz;
		const nz = px * qy - py * qx;
		if (nx === 0 && ny === 0 && nz === 0) continue;
		const ux = after[b] - after[a];
		const uy = after[b + 1] - after[a + 1];
		const uz = after[b + 2] - after[a + 2];
		const vx = after[c] - after[a];
		const vy = after[c + 1] - after[a + 1];
		const vz = after[c + 2] - after[a + 2];
		const turn = nx * (uy * vz - uz * vy) + ny * (uz * vx - ux * vz) + nz * (ux * vy - uy * vx);
		if (!(turn > 0)) {
			flipped++;
			if (!(turn >= worstTurn)) {
				worstTurn = turn;
				worstFlip = i / 3;
			}
		}
		const uu = ux * ux + uy * uy + uz * uz;
		const vv = vx * vx + vy * vy + vz * vz;
		const uv = ux * vx + uy * vy + uz * vz;
		const ww = uu + vv - 2 * uv;
		const lu = Math.sqrt(uu);
		const lv = Math.sqrt(vv);
		const lw = Math.sqrt(ww > 0 ? ww : 0);
		// Cosines at a, b, c; the largest belongs to the smallest angle.
		const cosA = uv / (lu * lv);
		const cosB = (uu - uv) / (lu * lw);
		const cosC = (vv - uv) / (lv * lw);
		let cosine = cosA > cosB ? cosA : cosB;
		if (cosC > cosine) cosine = cosC;
		// Collapsed edges give no number: the angle there is 0.
		if (!(cosine <= 1)) cosine = 1;
		if (cosine > limitCosine) narrow++;
		if (cosine > largestCosine) {
			largestCosine = cosine;
			worstAngle = i / 3;
		}
	}
	input.checkpoint?.(0.5);
	const place = (triangle: number): CheckResult['place'] => {
		if (triangle < 0) return null;
		const position: [number, number, number] = [0, 0, 0];
		for (let k = 0; k < 3; k++) {
			const v = 3 * triangles[3 * triangle + k];
			for (let d = 0; d < 3; d++) position[d] += ((input.metresPerUnit ?? 1) * after[v + d]) / 3;
		}
		return { triangle, position };
	};
	const angle = worstAngle < 0 ? 60 : (Math.acos(Math.min(1, Math.max(-1, largestCosine))) * 180) / Math.PI;
	const checks: MoveChecks = {
		flipped: { value: flipped, limit: 0, ok: flipped === 0, hard: true, count: flipped, place: place(worstFlip) },
		minAngle: {
			value: angle,
			limit,
			ok: angle >= limit,
			hard: input.minAngleHard ?? false,
			count: narrow,
			place: place(worstAngle)
		}
	};
	const all = moved ?? Uint32Array.from({ length: before.length / 3 }, (_, v) => v);
	const faces = movedFaces(triangles, mark);
	if (input.areaRatio) checks.areaRatio = checkAreas(input, faces, place);
	if (input.selfIntersection) {
		const positions = float64(after, 1);
		const { tree } = input.selfIntersection;
		const found = selfIntersections(positions, triangles, {
			chosen: faces,
			before: float64(before, 1),
			limit: 1,
			tree
		});
		checks.selfIntersection = {
			value: found.count,
			limit: 0,
			ok: found.count === 0,
			hard: true,
			count: found.count,
			place: found.count > 0 ? place(found.pairs[0]) : null,
			before: found.known
		};
	}
	input.checkpoint?.(0.7);
	if (input.thickness?.length || input.keepOuts?.length || input.radius) {
		const metres = input.metresPerUnit ?? 1;
		const surface: MovedSurface = {
			before: float64(before, metres),
			after: float64(after, metres),
			triangles,
			moved: all,
			faces
		};
		const { thickness, keepOuts, radius } = input;
		if (thickness?.length) checks.thickness = checkThickness(surface, thickness);
		if (keepOuts?.length) checks.keepOut = checkKeepOuts(surface, keepOuts);
		if (radius) checks.radius = checkRadius(surface, radius.limit);
	}
	input.checkpoint?.(1);
	return Object.fromEntries(Object.entries(checks).filter(([, check]) => check !== undefined)) as unknown as MoveChecks;
}

function float64(values: ArrayLike<number>, factor: number): Float64Array {
	if (values instanceof Float64Array && factor === 1) return values;
	const out = new Float64Array(values.length);
	for (let i = 0; i < out.length; i++) out[i] = factor * values[i];
	return out;
}

function movedFaces(triangles: Uint32Array, mark: Uint8Array | null): Uint32Array {
	const faces = new Uint32Array(triangles.length / 3);
	let count = 0;
	for (let t = 0; t < faces.length; t++) {
		if (!mark || mark[triangles[3 * t]] | mark[triangles[3 * t + 1]] | mark[triangles[3 * t + 2]]) faces[count++] = t;
	}
	return faces.slice(0, count);
}

/** The triangle whose area grew or shrank most against the parent's; those without area there are left out. */
function checkAreas(
	{ before, after, triangles, areaRatio }: CheckMoveInput,
	faces: Uint32Array,
	place: (triangle: number) => CheckResult['place']
): CheckResult {
	const { least, most } = areaRatio ?? USUAL_AREA_RATIO;
	let count = 0;
	let worst = 1;
	let at = -1;
	for (let i = 0; i < faces.length; i++) {
		const [a, b, c] = [3 * triangles[3 * faces[i]], 3 * triangles[3 * faces[i] + 1], 3 * triangles[3 * faces[i] + 2]];
		const old = doubleArea(before, a, b, c);
		if (!(old > 0)) continue;
		const ratio = doubleArea(after, a, b, c) / old;
		if (ratio < least || ratio > most) count++;
		// How far beyond, or how near to, the limit on its own side.
		if (at >= 0 && !(strain(ratio, least, most) > strain(worst, least, most))) continue;
		worst = ratio;
		at = faces[i];
	}
	return {
		value: worst,
		limit: worst < 1 ? least : most,
		ok: count === 0,
		hard: false,
		count,
		place: place(at)
	};
}

const strain = (ratio: number, least: number, most: number) =>
	ratio < 1 ? Math.log(ratio) / Math.log(least) : Math.log(ratio) / Math.log(most);

function doubleArea(p: ArrayLike<number>, a: number, b: number, c: number): number {
	const ux = p[b] - p[a];
	const uy = p[b + 1] - p[a + 1];
	const uz = p[b + 2] - p[a + 2];
	const vx = p[c] - p[a];
	const vy = p[c + 1] - p[a + 1];
	const vz = p[c + 2] - p[a + 2];
	const x = uy * vz - uz * vy;
	const y = uz * vx - ux * vz;
	const z = ux * vy - uy * vx;
	return Math.sqrt(x * x + y * y + z * z);
}
