import { CurvatureProbe, smallestRadii } from './curvature';
import type { PreparedKeepOut } from './keep-out';
import type { PreparedThickness } from './thickness';
import type { CheckResult } from './types';

/** What float32 coordinates can be off by, relative. */
const FLOAT32_ULP = 1.2e-7;
/** A radius that shrank by less than this share counts as kept: the estimate's own noise. */
const SAME_RADIUS = 0.98;
/** Metres by which a triangle may cut a keep-out between vertices that keep clear of it: below what is formed or printed. */
const SAG = 1e-4;

/** A moved surface, in metres. */
export interface MovedSurface {
	before: Float64Array;
	after: Float64Array;
	triangles: Uint32Array;
	/** Vertices that moved, ascending. */
	moved: Uint32Array;
	/** Triangles with such a vertex, ascending. */
	faces: Uint32Array;
}

/** By how much rounding to float32 can move a vertex. */
function rounding({ after, moved }: MovedSurface): number {
	let largest = 0;
	for (const v of moved) {
		for (let d = 0; d < 3; d++) largest = Math.max(largest, Math.abs(after[3 * v + d]));
	}
	return 2 * FLOAT32_ULP * largest;
}

function placeOf({ after, triangles, faces }: MovedSurface, vertex: number): CheckResult['place'] {
	for (const triangle of faces) {
		for (let k = 0; k < 3; k++) {
			if (triangles[3 * triangle + k] !== vertex) continue;
			return { triangle, position: [after[3 * vertex], after[3 * vertex + 1], after[3 * vertex + 2]] };
		}
	}
	return null;
}

/** Distance to keep-outs, at vertices against the clearance and between them against the geometry itself. Hard. */
export function checkKeepOuts(
	surface: MovedSurface,
	keepOuts: { label: string; prepared: PreparedKeepOut }[]
): CheckResult | undefined {
	const tolerance = rounding(surface);
	let worst: CheckResult | undefined;
	let room = Infinity;
	let count = 0;
	for (const { label, prepared } of keepOuts) {
		const found = prepared.penetration(surface.after, surface.triangles, surface.faces, tolerance, SAG);
		if (found.distance === null || found.position === null) continue;
		const broken = found.vertices + found.cuts;
		count += broken;
		// A broken one before one that merely has less room.
		const rank = found.distance - prepared.clearance - (broken > 0 ? 1e6 : 0);
		if (rank >= room) continue;
		room = rank;
		worst = {
			value: found.distance,
			limit: prepared.clearance,
			ok: broken === 0,
			hard: true,
			count: broken,
			place: { triangle: found.triangle, position: found.position },
			label
		};
	}
	if (worst) worst.count = count;
	return worst;
}

/** Thinnest wall under the moved vertices (or those of them that are meant). Hard. */
export function checkThickness(
	surface: MovedSurface,
	walls: { prepared: PreparedThickness; vertices?: Uint32Array }[]
): CheckResult | undefined {
	const tolerance = rounding(surface);
	let shown: CheckResult | undefined;
	let total = 0;
	for (const { prepared, vertices } of walls) {
		const wanted = vertices && new Set(vertices);
		const meant = wanted ? surface.moved.filter((v) => wanted.has(v)) : surface.moved;
		const rows = prepared.place(meant).rows(surface.after, Infinity);
		let count = 0;
		let thinnest = -1;
		let broken = -1;
		for (let k = 0; k < rows.count; k++) {
			if (thinnest < 0 || rows.values[k] < rows.values[thinnest]) thinnest = k;
			if (rows.slack[k] >= -tolerance) continue;
			count++;
			if (broken < 0 || rows.slack[k] < rows.slack[broken]) broken = k;
		}
		total += count;
		// A place that was thin before and is no thinner is no news where another one has become too thin.
		const k = broken >= 0 ? broken : thinnest;
		if (k < 0) continue;
		const ok = count === 0;
		if (shown && (ok || (!shown.ok && shown.value - shown.limit <= rows.values[k] - prepared.least))) continue;
		const place = placeOf(surface, rows.vertices[rows.starts[k]]);
		shown = { value: rows.values[k], limit: prepared.least, ok, hard: true, count, place };
	}
	if (shown) shown.count = total;
	return shown;
}

/**
 * Smallest radius of convex curvature at the moved vertices. With a limit it is hard: no vertex below the limit may become
 * sharper than it was. Without one, the parent's smallest radius is the limit, and breaking it a warning.
 */
export function checkRadius(surface: MovedSurface, limit: number | undefined): CheckResult | undefined {
	const { before, after, triangles, moved } = surface;
	const probe = new CurvatureProbe(triangles, after.length / 3, moved);
	const then = probe.at(before);
	const now = probe.at(after);
	const parent = smallestRadii(moved, then).convex;
	const child = smallestRadii(moved, now).convex;
	// A surface without convex ground has no such radius.
	if (child.vertex < 0) return undefined;
	const least = limit ?? parent.radius;
	if (!Number.isFinite(least)) return undefined;
	let count = 0;
	let worst = -1;
	for (let i = 0; i < moved.length; i++) {
		if (!(now.largest[i] * least > 1)) continue;
		const kept = now.largest[i] * SAME_RADIUS <= then.largest[i];
		if (kept) continue;
		count++;
		if (worst < 0 || now.largest[i] > now.largest[worst]) worst = i;
	}
	const vertex = worst >= 0 ? moved[worst] : child.vertex;
	return {
		value: worst >= 0 ? 1 / now.largest[worst] : child.radius,
		limit: least,
		ok: count === 0,
		hard: limit !== undefined,
		count,
		place: placeOf(surface, vertex),
		...(parent.vertex >= 0 && { before: parent.radius })
	};
}
