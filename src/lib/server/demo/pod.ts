/**
 * The demo's roof pod as an implicit surface: a superelliptic body (Barr 1981) whose exponents differ fore and aft, above and
 * below, cut flat by a floor with a rounded edge. The pod, its makers and its numbers are invented.
 *
 * Frame: metres; x along the flow with the nose towards -x, y to starboard, z up; z = 0 is the floor.
 */

/** Half lengths of the body ahead of and behind its largest section, and where that section stands. */
const NOSE_LENGTH = 1.09;
const TAIL_LENGTH = 1.09;
const LARGEST_SECTION = -0.01;

/** A point well inside, from which every direction meets the surface once. */
export const POD_CENTRE: readonly [number, number, number] = [0, 0, 0.13];

const NOSE_EXPONENT = 2;
/** High: the section hardly shrinks before the end, which is the blunt tail that wants shaping. */
const TAIL_EXPONENT = 9;
const SIDE_EXPONENT = 2.8;
const CROWN_EXPONENT = 2.3;
const KEEL_EXPONENT = 2.2;

const HALF_WIDTH = 0.4293;
const CROWN_HEIGHT = 0.343;
const KEEL_DEPTH = 0.26;
/** The tail's end leans forward: metres along x for each metre up. */
const TAIL_LEAN = 0.32;
/** Width of the band in which the floor and the body blend into the rounded lower edge. */
const EDGE_BLEND = 0.1;

/** 0 below a, 1 above b, with two continuous derivatives between (Perlin 2002). */
export function smootherstep(a: number, b: number, x: number): number {
	const t = Math.min(1, Math.max(0, (x - a) / (b - a)));
	return t * t * t * (t * (6 * t - 15) + 10);
}

/** Two shallow ridges along the crown, faded in behind the nose and out before the tail. */
function ridge(x: number, y: number): number {
	const fade = smootherstep(-0.9, -0.25, x) * (1 - smootherstep(0.35, 0.95, x));
	const across = (Math.abs(y) - 0.21) / 0.075;
	return 0.013 * fade * Math.exp(-across * across);
}

/** The body's implicit function: -1 in its middle, 0 on it, growing outward; without the floor. */
function body(x: number, y: number, z: number): number {
	const aft = x > LARGEST_SECTION;
	// The waterline, where the section is widest, rises a little aft; plan and crown taper towards the tail, the crown also to the nose.
	const waterline = 0.1 + 0.028 * smootherstep(-1.1, 0.7, x);
	const halfWidth = HALF_WIDTH * (1 - 0.13 * smootherstep(-0.1, 1.3, x));
	const crown =
		CROWN_HEIGHT - 0.085 * smootherstep(-0.05, 1.35, x) - 0.09 * (1 - smootherstep(-1.15, -0.1, x)) - waterline;
	const along = aft
		? (x - LARGEST_SECTION + TAIL_LEAN * (z - waterline) * smootherstep(0.2, 1.2, x)) / TAIL_LENGTH
		: (LARGEST_SECTION - x) / NOSE_LENGTH;
	const above = z > waterline;
	const up = above ? (z - waterline) / (crown + ridge(x, y)) : (waterline - z) / KEEL_DEPTH;
	return (
		Math.pow(Math.max(0, along), aft ? TAIL_EXPONENT : NOSE_EXPONENT) +
		Math.pow(Math.abs(y) / halfWidth, SIDE_EXPONENT) +
		Math.pow(up, above ? CROWN_EXPONENT : KEEL_EXPONENT) -
		1
	);
}

const DIFFERENCE = 1e-6;
/** Below this slope (deep inside) the value is not scaled to a distance. */
const LEAST_SLOPE = 0.5;

/**
 * Signed distance from the pod's baseline surface without its feet, in metres, positive outside; exact on the surface and to first
 * order near it. Its gradient, the outward unit normal where the point lies on the surface, goes into `normal` (length 3) if given.
 */
export function podDistance(x: number, y: number, z: number, normal?: Float64Array): number {
	const f = body(x, y, z);
	const fx = (body(x + DIFFERENCE, y, z) - f) / DIFFERENCE;
	const fy = (body(x, y + DIFFERENCE, z) - f) / DIFFERENCE;
	const fz = (body(x, y, z + DIFFERENCE) - f) / DIFFERENCE;
	const slope = Math.max(LEAST_SLOPE, Math.hypot(fx, fy, fz));
	const shell = f / slope;
	// Smooth maximum of the shell and the floor's half space; cubic, so that curvature stays continuous across the edge.
	const apart = shell + z;
	const overlap = Math.max(0, EDGE_BLEND - Math.abs(apart)) / EDGE_BLEND;
	if (normal) {
		const share = apart > 0 ? 1 - (overlap * overlap) / 2 : (overlap * overlap) / 2;
		const nx = (share * fx) / slope;
		const ny = (share * fy) / slope;
		const nz = (share * fz) / slope - (1 - share);
		const length = Math.hypot(nx, ny, nz);
		normal[0] = nx / length;
		normal[1] = ny / length;
		normal[2] = nz / length;
	}
	return Math.max(shell, -z) + (overlap * overlap * overlap * EDGE_BLEND) / 6;
}
