import { pierces } from './crossing';
import type { DistanceField } from './signed-distance';
import type { TriangleTree } from './triangle-tree';

/** A triangle that cuts a keep-out between its vertices. */
export interface Cut {
	triangle: number;
	/** Smallest signed distance found on it, metres. */
	distance: number;
	position: [number, number, number];
}

/** Halvings of a triangle's sides in the search for its deepest point. */
const DEEPEST = 6;

/**
 * Triangles that cross the geometry's surface without a broken vertex, and reach deeper into it than `sag`.
 * @param broken vertices that are told of anyhow
 * @param sign 1 where the allowed side is outside, -1 inside
 */
export function cutsBetween(
	p: Float64Array,
	triangles: Uint32Array,
	chosen: Uint32Array,
	broken: Set<number>,
	tree: TriangleTree,
	field: DistanceField,
	sign: 1 | -1,
	sag: number
): Cut[] {
	const cuts: Cut[] = [];
	const { corners, points: q } = tree;
	for (let i = 0; i < chosen.length; i++) {
		const t = 3 * chosen[i];
		if (broken.has(triangles[t]) || broken.has(triangles[t + 1]) || broken.has(triangles[t + 2])) continue;
		const a = 3 * triangles[t];
		const b = 3 * triangles[t + 1];
		const c = 3 * triangles[t + 2];
		const x0 = Math.min(p[a], p[b], p[c]);
		const y0 = Math.min(p[a + 1], p[b + 1], p[c + 1]);
		const z0 = Math.min(p[a + 2], p[b + 2], p[c + 2]);
		const x1 = Math.max(p[a], p[b], p[c]);
		const y1 = Math.max(p[a + 1], p[b + 1], p[c + 1]);
		const z1 = Math.max(p[a + 2], p[b + 2], p[c + 2]);
		const size = Math.max(x1 - x0, y1 - y0, z1 - z0);
		const crossing = tree.meeting(x0, y0, z0, x1, y1, z1, (o) => {
			const d = 3 * corners[o];
			const e = 3 * corners[o + 1];
			const f = 3 * corners[o + 2];
			return (
				pierces(p, a, b, q, d, e, f, size) ||
				pierces(p, b, c, q, d, e, f, size) ||
				pierces(p, c, a, q, d, e, f, size) ||
				pierces(q, d, e, p, a, b, c, size) ||
				pierces(q, e, f, p, a, b, c, size) ||
				pierces(q, f, d, p, a, b, c, size)
			);
		});
		if (!crossing) continue;
		const deepest = deepestPoint(p, a, b, c, field, sign);
		if (deepest.distance < -sag) cuts.push({ triangle: chosen[i], ...deepest });
	}
	return cuts;
}

/**
 * Smallest signed distance on a triangle: quarters whose centre is farther from the least so far than any of their points
 * can be from the centre are left out, the distance changing no faster than the place.
 */
function deepestPoint(
	p: Float64Array,
	a: number,
	b: number,
	c: number,
	field: DistanceField,
	sign: 1 | -1
): { distance: number; position: [number, number, number] } {
	const corner = (o: number): [number, number, number] => [p[o], p[o + 1], p[o + 2]];
	const best = { distance: Infinity, position: corner(a) };
	const stack: [[number, number, number], [number, number, number], [number, number, number], number][] = [
		[corner(a), corner(b), corner(c), 0]
	];
	const middle = (u: readonly number[], v: readonly number[]): [number, number, number] => [
		(u[0] + v[0]) / 2,
		(u[1] + v[1]) / 2,
		(u[2] + v[2]) / 2
	];
	for (let top = stack.pop(); top; top = stack.pop()) {
		const [u, v, w, depth] = top;
		const centre: [number, number, number] = [0, 1, 2].map((d) => (u[d] + v[d] + w[d]) / 3) as [number, number, number];
		field.at(centre[0], centre[1], centre[2], -Infinity, Infinity);
		const distance = sign * field.distance;
		if (distance < best.distance) Object.assign(best, { distance, position: centre });
		const radius = Math.max(...[u, v, w].map((x) => Math.hypot(x[0] - centre[0], x[1] - centre[1], x[2] - centre[2])));
		if (depth === DEEPEST || distance - radius >= best.distance) continue;
		const [uv, vw, wu] = [middle(u, v), middle(v, w), middle(w, u)];
		stack.push([u, uv, wu, depth + 1], [uv, v, vw, depth + 1], [wu, vw, w, depth + 1], [uv, vw, wu, depth + 1]);
	}
	return best;
}
