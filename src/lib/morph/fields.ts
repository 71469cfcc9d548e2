import { MorphError } from './errors';
import type { MoveSpace } from './space';
import type { Reduced } from './system';
import type { MoveObjective, Surface } from './types';

/** A gradient brought into the reduced space: its row, H^-1 row, and the surface field of H^-1 row. */
export interface Prepared {
	row: Reduced;
	solved: Reduced;
	/** moved.length x 3 */
	field: Float64Array;
}

/** Prepared gradients, kept by the identity of their arrays. */
export class GradientCache {
	private readonly kept = new WeakMap<Float64Array, Prepared>();

	constructor(private readonly space: MoveSpace) {}

	get(gradient: Float64Array): Prepared {
		let prepared = this.kept.get(gradient);
		if (!prepared) {
			const row = this.space.row(gradient);
			const solved = this.space.solve(row);
			prepared = { row, solved, field: this.space.field(solved) };
			this.kept.set(gradient, prepared);
		}
		return prepared;
	}
}

/** sum over the moved vertices of g . dx, for g of N x 3 and dx of moved x 3. */
export function along(gradient: Float64Array, moved: Uint32Array, displacement: Float64Array): number {
	let sum = 0;
	for (let i = 0; i < moved.length; i++) {
		const v = 3 * moved[i];
		sum +=
			gradient[v] * displacement[3 * i] +
			gradient[v + 1] * displacement[3 * i + 1] +
			gradient[v + 2] * displacement[3 * i + 2];
	}
	return sum;
}

/** sum of factors[k] * fields[k] */
export function mix(factors: number[], fields: Float64Array[]): Float64Array {
	const out = new Float64Array(fields[0].length);
	for (let k = 0; k < fields.length; k++) {
		const f = factors[k];
		if (f === 0) continue;
		const field = fields[k];
		for (let i = 0; i < out.length; i++) out[i] += f * field[i];
	}
	return out;
}

/** Largest and root mean square length of n vectors. */
export function displacementNorms(displacement: Float64Array): { max: number; rms: number } {
	let max = 0;
	let sum = 0;
	for (let i = 0; i < displacement.length; i += 3) {
		const s = displacement[i] ** 2 + displacement[i + 1] ** 2 + displacement[i + 2] ** 2;
		sum += s;
		if (s > max) max = s;
	}
	const n = displacement.length / 3;
	return { max: Math.sqrt(max), rms: n > 0 ? Math.sqrt(sum / n) : 0 };
}

/** Refuses gradients of the wrong length or with entries that are not finite. */
export function checkObjectives(objectives: MoveObjective[], surface: Surface): void {
	const seen = new Set<string>();
	for (const objective of objectives) {
		const place = { objective: objective.id };
		if (seen.has(objective.id)) {
			throw new MorphError('gradient-missing', `Objective "${objective.id}" is given twice.`, 'Give each once.', place);
		}
		seen.add(objective.id);
		if (!Number.isFinite(objective.weight) || objective.weight < 0) {
			throw new MorphError(
				'gradient-missing',
				`Objective "${objective.id}" has the weight ${objective.weight}.`,
				'Give a weight of 0 or more; the sense says whether it falls or rises.',
				place
			);
		}
		if (objective.gradient.length !== surface.positions.length) {
			throw new MorphError(
				'map-shape',
				`The gradient of objective "${objective.id}" has ${objective.gradient.length} entries; the surface needs ` +
					`${surface.positions.length}.`,
				'Give three numbers per vertex of this shape.',
				place
			);
		}
		for (let i = 0; i < objective.gradient.length; i++) {
			if (!Number.isFinite(objective.gradient[i])) {
				throw new MorphError(
					'map-shape',
					`The gradient of objective "${objective.id}" is not finite at vertex ${Math.floor(i / 3)}.`,
					'Upload a map with finite values only.',
					{ ...place, vertex: Math.floor(i / 3) }
				);
			}
		}
	}
}
