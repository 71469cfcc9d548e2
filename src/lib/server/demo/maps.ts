/**
 * Invented sensitivity maps of the demo's pod. Each is a field of position and outward normal, so that it can be sampled on any shape
 * of the study: a smooth density, less of it where a move has already followed it (a convex quadratic objective), and the noise from
 * vertex to vertex that adjoint maps carry. No flow was solved.
 */
import { podDistance, smootherstep } from './pod';
import type { DemoSurface } from './pod-mesh';

export type DemoObjective = 'drag' | 'lift';

const METRES_PER_UNIT = 1e-3;

function bell(x: number, centre: number, width: number): number {
	const t = (x - centre) / width;
	return Math.exp(-t * t);
}

/**
 * Density of a map: the objective's change in newtons for each metre that each square metre moves outward.
 * Point in metres (nose towards -x, z up from the floor), unit outward normal.
 */
export function density(
	objective: DemoObjective,
	p: readonly [number, number, number],
	n: readonly [number, number, number]
): number {
	const [x, y, z] = p;
	const up = Math.max(0, n[2]);
	const side = Math.abs(n[1]);
	const aft = Math.max(0, n[0]);
	const fore = Math.max(0, -n[0]);
	const down = Math.max(0, -n[2]);
	// Displacement since the baseline; the feet and the floor do not move.
	const moved = z > 0.02 ? podDistance(x, y, z) : 0;
	if (objective === 'drag') {
		const nose = 2400 * bell(x, -0.93, 0.17) * (0.35 + 0.65 * up) - 400 * bell(x, -1.12, 0.06) * fore;
		const suction = -820 * bell(x, -0.5, 0.17) * (0.3 * side + up);
		const tailShoulder = -2000 * bell(x, 0.56, 0.17) * (0.45 * side + up) * (0.8 + 0.2 * Math.cos(5 * y));
		const tailRim = 2500 * bell(x, 0.93, 0.1) * (0.6 * side + up + 0.25 * aft) * (1 - 0.25 * bell(y, 0, 0.12));
		const base = -640 * smootherstep(0.6, 0.95, aft);
		const under = 190 * down * bell(x, -0.7, 0.3) - 150 * down * bell(x, 0.8, 0.3);
		const stiffness = 1.1e5 * (0.4 + bell(x, 0.8, 0.35) + 0.7 * bell(x, -0.8, 0.3));
		return nose + suction + tailShoulder + tailRim + base + under + stiffness * moved;
	}
	const crown = 900 * bell(x, -0.25, 0.45) * up;
	const tail = -1100 * bell(x, 0.85, 0.22) * up;
	const nose = -340 * bell(x, -1, 0.12) * up + 210 * down * bell(x, -0.95, 0.2);
	return crown + tail + nose + 0.4e5 * (0.3 + bell(x, 0.8, 0.4)) * moved;
}

/** Uniform in [-1, 1), the same for the same position: mixes the bits of the three floats (Murmur3's finaliser). */
function noise(bits: Uint32Array, seed: number): number {
	let h = seed >>> 0;
	for (const word of bits) {
		h = Math.imul(h ^ word, 0x85ebca6b);
		h = Math.imul(h ^ (h >>> 13), 0xc2b2ae35);
		h ^= h >>> 16;
	}
	return (h >>> 0) / 0x80000000 - 1;
}

/** What a mesh does to an adjoint map, as shares of the local value and of the map's scale; one vertex in `SPIKE` stands out. */
const NOISE_LOCAL = 0.16;
const NOISE_FLOOR: Record<DemoObjective, number> = { drag: 55, lift: 25 };
const SPIKE_ABOVE = 0.992;

/** The map at each vertex of a surface: N values in N per m per m^2. The surface is borrowed. */
export function sampleMap(
	objective: DemoObjective,
	surface: Pick<DemoSurface, 'positions' | 'triangles'>
): Float64Array {
	const { positions, triangles } = surface;
	const normals = new Float64Array(positions.length);
	for (let t = 0; t < triangles.length; t += 3) {
		const [a, b, c] = [3 * triangles[t], 3 * triangles[t + 1], 3 * triangles[t + 2]];
		const ux = positions[b] - positions[a];
		const uy = positions[b + 1] - positions[a + 1];
		const uz = positions[b + 2] - positions[a + 2];
		const vx = positions[c] - positions[a];
		const vy = positions[c + 1] - positions[a + 1];
		const vz = positions[c + 2] - positions[a + 2];
		for (const corner of [a, b, c]) {
			normals[corner] += uy * vz - uz * vy;
			normals[corner + 1] += uz * vx - ux * vz;
			normals[corner + 2] += ux * vy - uy * vx;
		}
	}
	const bits = new Uint32Array(positions.buffer, positions.byteOffset, positions.length);
	const values = new Float64Array(positions.length / 3);
	const seed = objective === 'drag' ? 0x430 : 0x90;
	for (let v = 0; v < values.length; v++) {
		const at = 3 * v;
		const length = Math.hypot(normals[at], normals[at + 1], normals[at + 2]) || 1;
		const smooth = density(
			objective,
			[METRES_PER_UNIT * positions[at], METRES_PER_UNIT * positions[at + 1], METRES_PER_UNIT * positions[at + 2]],
			[normals[at] / length, normals[at + 1] / length, normals[at + 2] / length]
		);
		const word = bits.subarray(at, at + 3);
		const first = noise(word, seed);
		const second = noise(word, seed + 1);
		const spike = noise(word, seed + 2) > SPIKE_ABOVE ? 4 : 1;
		values[v] = smooth * (1 + NOISE_LOCAL * spike * first) + NOISE_FLOOR[objective] * spike * second;
	}
	return values;
}

const OBJECTIVE_TITLE: Record<DemoObjective, string> = {
	drag: 'drag, headwind 90 km/h',
	lift: 'lift, headwind 90 km/h'
};

/** The map as a CSV file: x, y, z in millimetres (each float32 in the digits that read back as itself), value in N per m per m^2. */
export function mapCsv(
	objective: DemoObjective,
	shapeNumber: number,
	surface: Pick<DemoSurface, 'positions' | 'triangles'>
): Uint8Array {
	const values = sampleMap(objective, surface);
	const { positions } = surface;
	const lines = [
		`# INVENTED DATA: no flow was solved. Sensitivity of ${OBJECTIVE_TITLE[objective]}; Touring pod 430, shape ${shapeNumber}.`,
		'# x, y, z in mm; sensitivity in N per m outward per m^2',
		'x,y,z,sensitivity'
	];
	for (let v = 0; v < values.length; v++) {
		const [x, y, z] = [positions[3 * v], positions[3 * v + 1], positions[3 * v + 2]].map(shortest);
		lines.push(`${x},${y},${z},${Number(values[v].toPrecision(7))}`);
	}
	return new TextEncoder().encode(lines.join('\n') + '\n');
}

/** The fewest digits that read back as the same float32. */
function shortest(value: number): number {
	for (let digits = 6; digits < 9; digits++) {
		const short = Number(value.toPrecision(digits));
		if (Math.fround(short) === value) return short;
	}
	return Number(value.toPrecision(9));
}
