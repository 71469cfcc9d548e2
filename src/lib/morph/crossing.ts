/** Relative size below which six times a tetrahedron's volume counts as zero: touching is not crossing. */
const FLAT = 1e-10;

/** Six times the signed volume of (a, b, c of q, d of p), zeroed where it is within roundoff of the cube of `size`. */
function side(q: Float64Array, a: number, b: number, c: number, p: Float64Array, d: number, flat: number): number {
	const x = q[a];
	const y = q[a + 1];
	const z = q[a + 2];
	const ux = q[b] - x;
	const uy = q[b + 1] - y;
	const uz = q[b + 2] - z;
	const vx = q[c] - x;
	const vy = q[c + 1] - y;
	const vz = q[c + 2] - z;
	const det =
		(p[d] - x) * (uy * vz - uz * vy) + (p[d + 1] - y) * (uz * vx - ux * vz) + (p[d + 2] - z) * (ux * vy - uy * vx);
	return det <= flat && det >= -flat ? 0 : det;
}

/** Six times the signed volume of (d, e of p, a, b of q). */
function along(p: Float64Array, d: number, e: number, q: Float64Array, a: number, b: number, flat: number): number {
	const x = p[d];
	const y = p[d + 1];
	const z = p[d + 2];
	const ux = p[e] - x;
	const uy = p[e + 1] - y;
	const uz = p[e + 2] - z;
	const vx = q[a] - x;
	const vy = q[a + 1] - y;
	const vz = q[a + 2] - z;
	const det =
		(q[b] - x) * (uy * vz - uz * vy) + (q[b + 1] - y) * (uz * vx - ux * vz) + (q[b + 2] - z) * (ux * vy - uy * vx);
	return det <= flat && det >= -flat ? 0 : det;
}

/**
 * Whether the segment d-e of p passes through the inside of the triangle a, b, c of q: the segment's ends lie on different
 * sides of the plane, and the three edges on one side of the segment's line (signs of tetrahedra, as in Moeller, Journal of
 * Graphics Tools 2, 1997, and Guigue and Devillers, the same 8, 2003). Touching is not passing through.
 * @param d, e, a, b, c offsets (3 times the vertex)
 * @param size length of the larger thing, for the roundoff
 */
export function pierces(
	p: Float64Array,
	d: number,
	e: number,
	q: Float64Array,
	a: number,
	b: number,
	c: number,
	size: number
): boolean {
	const flat = FLAT * size * size * size;
	const from = side(q, a, b, c, p, d, flat);
	if (from === 0) return false;
	const to = side(q, a, b, c, p, e, flat);
	if (!(from > 0 ? to < 0 : to > 0)) return false;
	const x = along(p, d, e, q, a, b, flat);
	if (x === 0) return false;
	const y = along(p, d, e, q, b, c, flat);
	if (!(x > 0 ? y > 0 : y < 0)) return false;
	const z = along(p, d, e, q, c, a, flat);
	return x > 0 ? z > 0 : z < 0;
}
