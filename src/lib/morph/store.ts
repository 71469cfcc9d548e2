import { boundsCentre, toMetres, volumeGradient, volumeOf } from './surface';
import type { StoredPositions } from './types';

export interface StoreOptions {
	/** Length of the file's unit in metres. */
	metresPerUnit: number;
	/** F x 3, needed for the volume; borrowed. */
	triangles: Uint32Array;
	/** m^3 that the stored surface must enclose: give it where the volume is an equality. */
	targetVolume?: number;
	/** Mirror images among the moved (MoveSolution.partners): nudged together, so that a symmetric surface stays so. */
	partners?: Int32Array | null;
	/** What the volume is summed about, metres: the surface's origin; default near the surface. */
	origin?: readonly [number, number, number];
}

/** Where nudging stops: far below the promise of 1e-9, above the roundoff of the sum itself. */
const VOLUME_TOLERANCE = 2e-11;
const ROUNDS = 4;

const cell = new DataView(new ArrayBuffer(4));

/** The float32 next to x towards larger (up) or smaller values. */
export function nextFloat32(x: number, up: boolean): number {
	if (x === 0) {
		cell.setInt32(0, 1);
		return up ? cell.getFloat32(0) : -cell.getFloat32(0);
	}
	cell.setFloat32(0, x);
	cell.setInt32(0, cell.getInt32(0) + (x > 0 === up ? 1 : -1));
	return cell.getFloat32(0);
}

/**
 * The moved positions in float64 metres.
 * @param positions N x 3 metres, borrowed
 * @param moved n vertex ids
 * @param displacement n x 3 metres
 */
export function applyDisplacement(
	positions: Float64Array,
	moved: Uint32Array,
	displacement: Float64Array
): Float64Array {
	const out = positions.slice();
	for (let i = 0; i < moved.length; i++) {
		const v = 3 * moved[i];
		out[v] += displacement[3 * i];
		out[v + 1] += displacement[3 * i + 1];
		out[v + 2] += displacement[3 * i + 2];
	}
	return out;
}

/**
 * Rounds a moved surface to float32 in the file's unit. Vertices without displacement keep their bits.
 *
 * Rounding changes the volume by some 1e-9 of itself; where the volume is held, single coordinates of moved vertices go
 * to the neighbouring float32, in a fixed order, until the stored surface holds it. First only coordinates that stay
 * within one unit in the last place of the exact result, then any.
 *
 * @param parent N x 3 in the file's unit, borrowed
 * @param moved n vertex ids, ascending
 * @param displacement n x 3 metres
 */
export function storePositions(
	parent: Float32Array,
	moved: Uint32Array,
	displacement: Float64Array,
	options: StoreOptions
): StoredPositions {
	const { metresPerUnit, triangles, targetVolume, partners } = options;
	const positions = parent.slice();
	for (let i = 0; i < moved.length; i++) {
		for (let d = 0; d < 3; d++) {
			const dx = displacement[3 * i + d];
			if (dx === 0) continue;
			const at = 3 * moved[i] + d;
			// Adding 0 turns -0 into +0, the one zero that welding keeps.
			positions[at] = Math.fround((parent[at] * metresPerUnit + dx) / metresPerUnit) + 0;
		}
	}
	const metres = toMetres(positions, metresPerUnit);
	const origin = options.origin ?? boundsCentre(metres);
	let volume = volumeOf(metres, triangles, origin);
	let nudges = 0;
	if (targetVolume === undefined) return { positions, volume, nudges, volumeError: 0 };
	const size = Math.abs(targetVolume);
	// A stride prime to the count spreads the nudges over the moved surface.
	const stride = spreadStride(moved.length);
	for (let round = 0; round < ROUNDS && Math.abs(volume - targetVolume) > VOLUME_TOLERANCE * size; round++) {
		const gradient = volumeGradient(metres, triangles, origin);
		let rest = targetVolume - volume;
		for (let k = 0, i = 0; k < moved.length; k++, i = (i + stride) % moved.length) {
			if (Math.abs(rest) <= 0.1 * VOLUME_TOLERANCE * size) break;
			const image = partners ? partners[i] : -1;
			// A pair is nudged once, from its first.
			if (image >= 0 && image < i) continue;
			const twice = image > i ? 2 : 1;
			let bestGain = 0;
			let bestAt = -1;
			let bestValue = 0;
			for (let d = 0; d < 3; d++) {
				const dx = displacement[3 * i + d];
				const at = 3 * moved[i] + d;
				const slope = gradient[at];
				if (dx === 0 || slope === 0) continue;
				const up = slope * rest > 0;
				const exact = (parent[at] * metresPerUnit + dx) / metresPerUnit;
				if (round === 0 && exact > positions[at] !== up) continue;
				const next = nextFloat32(positions[at], up);
				const gain = twice * slope * (next - positions[at]) * metresPerUnit;
				// The longest stride that does not overshoot.
				if (Math.abs(gain) <= 1.5 * Math.abs(rest) && Math.abs(gain) > Math.abs(bestGain)) {
					bestGain = gain;
					bestAt = at;
					bestValue = next;
				}
			}
			if (bestAt < 0) continue;
			if (twice === 2) {
				// The image's coordinate that moves with it: the same one for a plane across an axis, found by its displacement.
				const other = 3 * moved[image] + (bestAt % 3);
				const opposite = displacement[3 * image + (bestAt % 3)] === -displacement[3 * i + (bestAt % 3)];
				const step = bestValue - positions[bestAt];
				positions[other] = Math.fround(positions[other] + (opposite ? -step : step)) + 0;
				metres[other] = positions[other] * metresPerUnit;
			}
			positions[bestAt] = bestValue + 0;
			metres[bestAt] = positions[bestAt] * metresPerUnit;
			rest -= bestGain;
			nudges += twice;
		}
		volume = volumeOf(metres, triangles, origin);
	}
	return { positions, volume, nudges, volumeError: size > 0 ? Math.abs(volume - targetVolume) / size : 0 };
}

function spreadStride(count: number): number {
	const gcd = (a: number, b: number): number => (b === 0 ? a : gcd(b, a % b));
	let stride = Math.max(1, Math.round(count * 0.6180339887));
	while (count > 1 && gcd(stride, count) !== 1) stride++;
	return stride;
}
