import { MorphError } from './errors';
import { boundsCentre, checkMesh, isWatertight, volumeGradient, volumeOf } from './surface';
import { onPlane } from './symmetry';
import type { SymmetryPlane } from './types';

export type RehearsalKind = 'wettedArea' | 'volume' | 'frontalArea' | 'impactDrag';

/** A built-in analytic objective, for trying boxes and constraints with no solver: not a flow solution. */
export interface RehearsalSpec {
	kind: RehearsalKind;
	/**
	 * Unit vector e along which the flow moves, for frontalArea and impactDrag; default +x. A triangle with the outward normal n
	 * faces the wind where n . e < 0.
	 */
	direction?: readonly [number, number, number];
	/** Largest pressure coefficient Cpmax of impactDrag, > 0; default 2 (Newton). */
	stagnation?: number;
	/** Triangles meant, each once; default the whole surface. */
	triangles?: Uint32Array;
	/** Plane of a half model: closes its volume. */
	symmetry?: SymmetryPlane;
}

export interface Rehearsal {
	/** m^2 (wettedArea, frontalArea, impactDrag) or m^3 (volume). */
	value: number;
	/** N x 3: its exact derivative by the vertices, value per metre. */
	gradient: Float64Array;
}

type Vec3 = readonly [number, number, number];

const KINDS: readonly string[] = ['wettedArea', 'volume', 'frontalArea', 'impactDrag'];
const NEWTON = 2;
const UNIT = 1e-6;

function refuse(message: string, mend: string): never {
	throw new MorphError('rehearsal-invalid', message, mend);
}

/**
 * A rehearsal objective's value and its exact gradient on the discrete surface. With the vector area
 * N = (b - a) x (c - a) = 2 A n of a triangle (a, b, c), e the flow's direction:
 *
 * - wettedArea: sum of |N| / 2;
 * - volume: the enclosed volume by the divergence theorem; the triangles meant must close;
 * - frontalArea: sum of -N . e / 2 over the triangles that face the wind: the area that a convex body shows to it, each
 *   triangle of a body that hides parts of itself counted for itself;
 * - impactDrag: drag by Newton's impact theory (Principia II, Prop. 34) per dynamic pressure, Cp A (-n . e) with
 *   Cp = Cpmax (n . e)^2 over the triangles that face the wind and 0 on the lee side; Cpmax behind a normal shock makes it
 *   Lees' modified theory (1955). Shading of one part by another is left out. It has two continuous derivatives where a
 *   triangle turns away from the wind; frontalArea has a kink there, at which its gradient is that of the lee side.
 *
 * All but the volume are functions of N, whose derivative by a corner follows from dN = (b - c) x da and its cyclic images.
 * A triangle without area adds nothing and has no gradient.
 *
 * @param positions N x 3, metres; borrowed
 * @param triangles F x 3, counter-clockwise seen from outside; borrowed
 * @throws MorphError rehearsal-invalid, mesh-open (volume of what does not close), mesh-shape, mesh-non-finite
 */
export function rehearse(positions: Float64Array, triangles: Uint32Array, spec: RehearsalSpec): Rehearsal {
	checkMesh(positions, triangles);
	const { kind, stagnation = NEWTON } = spec;
	if (!KINDS.includes(kind)) {
		refuse(`The rehearsal objective "${String(kind)}" is unknown.`, `Use one of ${KINDS.join(', ')}.`);
	}
	const direction = directionOf(spec.direction ?? [1, 0, 0]);
	if (!Number.isFinite(stagnation) || stagnation <= 0) {
		refuse(`The stagnation pressure coefficient ${stagnation} is not usable.`, 'Give a number above 0; Newton has 2.');
	}
	const meant = spec.triangles ? corners(triangles, spec.triangles) : triangles;
	if (kind === 'volume') return enclosed(positions, meant, spec.symmetry);
	return summed(positions, meant, ofVectorArea(kind, direction, stagnation));
}

function directionOf(direction: Vec3): Vec3 {
	const length = Math.hypot(...direction);
	if (direction.length !== 3 || !direction.every(Number.isFinite) || Math.abs(length - 1) > UNIT) {
		refuse(`The direction ${direction.join(', ')} is no unit vector.`, 'Give three finite numbers of length 1.');
	}
	return [direction[0] / length, direction[1] / length, direction[2] / length];
}

/** The corners of some triangles, 3 each. */
function corners(triangles: Uint32Array, meant: Uint32Array): Uint32Array {
	const count = triangles.length / 3;
	const seen = new Uint8Array(count);
	const out = new Uint32Array(3 * meant.length);
	for (let i = 0; i < meant.length; i++) {
		const t = meant[i];
		if (t >= count || seen[t]) {
			throw new MorphError(
				'rehearsal-invalid',
				t >= count
					? `The rehearsal objective names triangle ${t}, but the surface has only ${count}.`
					: `The rehearsal objective names triangle ${t} twice.`,
				'Choose its patches again on this surface.',
				{ triangle: t }
			);
		}
		seen[t] = 1;
		for (let k = 0; k < 3; k++) out[3 * i + k] = triangles[3 * t + k];
	}
	if (out.length === 0) refuse('The rehearsal objective names no triangle.', 'Choose at least one patch, or all.');
	return out;
}

function enclosed(positions: Float64Array, triangles: Uint32Array, symmetry: SymmetryPlane | undefined): Rehearsal {
	const closed = isWatertight(triangles);
	if (!closed && !(symmetry && isWatertight(triangles, onPlane(positions, symmetry)))) {
		throw new MorphError(
			'mesh-open',
			'The part of the surface that the rehearsal objective means is open, so it encloses no volume.',
			'Choose patches that close together, or another rehearsal objective.'
		);
	}
	const origin = closed ? boundsCentre(positions) : (symmetry as SymmetryPlane).point;
	return {
		value: volumeOf(positions, triangles, origin),
		gradient: volumeGradient(positions, triangles, origin)
	};
}

/** A function of the vector area of a triangle: returns its value and writes its three derivatives. */
type OfVectorArea = (x: number, y: number, z: number, out: Float64Array) => number;

function ofVectorArea(kind: RehearsalKind, [ex, ey, ez]: Vec3, stagnation: number): OfVectorArea {
	const set = (out: Float64Array, x: number, y: number, z: number) => {
		out[0] = x;
		out[1] = y;
		out[2] = z;
	};
	if (kind === 'wettedArea') {
		return (x, y, z, out) => {
			const size = Math.sqrt(x * x + y * y + z * z);
			const f = 0.5 / size;
			set(out, f * x, f * y, f * z);
			return 0.5 * size;
		};
	}
	if (kind === 'frontalArea') {
		return (x, y, z, out) => {
			const s = -(x * ex + y * ey + z * ez);
			const on = s > 0 ? -0.5 : 0;
			set(out, on * ex, on * ey, on * ez);
			return s > 0 ? 0.5 * s : 0;
		};
	}
	// Cpmax (n . e)^2 A (-n . e) = Cpmax / 2 s^3 / |N|^2 with s = -N . e.
	return (x, y, z, out) => {
		const s = -(x * ex + y * ey + z * ez);
		if (s <= 0) {
			set(out, 0, 0, 0);
			return 0;
		}
		const square = x * x + y * y + z * z;
		const share = s / square;
		const f = -1.5 * stagnation * s * share;
		const g = -stagnation * s * share * share;
		set(out, f * ex + g * x, f * ey + g * y, f * ez + g * z);
		return 0.5 * stagnation * s * s * share;
	};
}

function summed(p: Float64Array, triangles: Uint32Array, of: OfVectorArea): Rehearsal {
	const gradient = new Float64Array(p.length);
	const g = new Float64Array(3);
	let value = 0;
	/** Adds (from - to) x g at the corner opposite to that edge. */
	const add = (corner: number, from: number, to: number) => {
		const x = p[from] - p[to];
		const y = p[from + 1] - p[to + 1];
		const z = p[from + 2] - p[to + 2];
		gradient[corner] += y * g[2] - z * g[1];
		gradient[corner + 1] += z * g[0] - x * g[2];
		gradient[corner + 2] += x * g[1] - y * g[0];
	};
	for (let i = 0; i < triangles.length; i += 3) {
		const a = 3 * triangles[i];
		const b = 3 * triangles[i + 1];
		const c = 3 * triangles[i + 2];
		const ux = p[b] - p[a];
		const uy = p[b + 1] - p[a + 1];
		const uz = p[b + 2] - p[a + 2];
		const vx = p[c] - p[a];
		const vy = p[c + 1] - p[a + 1];
		const vz = p[c + 2] - p[a + 2];
		const x = uy * vz - uz * vy;
		const y = uz * vx - ux * vz;
		const z = ux * vy - uy * vx;
		if (x === 0 && y === 0 && z === 0) continue;
		value += of(x, y, z, g);
		add(a, b, c);
		add(b, c, a);
		add(c, a, b);
	}
	return { value, gradient };
}
