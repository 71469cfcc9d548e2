import { MorphError } from './errors';
import type { BoxOperator } from './operator';
import type { ReducedSystem, Reduced } from './system';
import type { MoveObjective, Surface } from './types';

/** A gradient brought into the reduced space: its row, H^-1 row, and the surface field of H^-1 row. */
export interface Prepared {
	row: Reduced;
	solved: Reduced;
	lattices: Float64Array[];
	/** moved.length x 3 */
	field: Float64Array;
}

/** Vertices in any of the boxes, and where each box's own vertices stand among them. */
export class MovedSet {
	readonly ids: Uint32Array;
	private readonly slots: (Uint32Array | null)[];

	constructor(
		readonly operators: BoxOperator[],
		vertexCount: number
	) {
		if (operators.length === 1) {
			this.ids = operators[0].inside;
			this.slots = [null];
			return;
		}
		const mark = new Uint8Array(vertexCount);
		let count = 0;
		for (const op of operators) {
			for (const v of op.inside) {
				if (!mark[v]) {
					mark[v] = 1;
					count++;
				}
			}
		}
		this.ids = new Uint32Array(count);
		const slot = new Uint32Array(vertexCount);
		for (let v = 0, at = 0; v < vertexCount; v++) {
			if (!mark[v]) continue;
			slot[v] = at;
			this.ids[at++] = v;
		}
		this.slots = operators.map((op) => Uint32Array.from(op.inside, (v) => slot[v]));
	}

	/** The surface field of lattice displacements (by box, nPoints x 3), summed over the boxes. */
	evaluate(lattices: Float64Array[]): Float64Array {
		const single = this.slots[0] === null;
		if (single) return this.operators[0].evaluate(lattices[0]);
		const out = new Float64Array(3 * this.ids.length);
		this.operators.forEach((op, b) => {
			const part = op.evaluate(lattices[b]);
			const slots = this.slots[b] as Uint32Array;
			for (let i = 0; i < slots.length; i++) {
				const at = 3 * slots[i];
				out[at] += part[3 * i];
				out[at + 1] += part[3 * i + 1];
				out[at + 2] += part[3 * i + 2];
			}
		});
		return out;
	}

	/** sum over the moved vertices of g . dx, for g of N x 3. */
	along(gradient: Float64Array, displacement: Float64Array): number {
		let sum = 0;
		for (let i = 0; i < this.ids.length; i++) {
			const v = 3 * this.ids[i];
			sum +=
				gradient[v] * displacement[3 * i] +
				gradient[v + 1] * displacement[3 * i + 1] +
				gradient[v + 2] * displacement[3 * i + 2];
		}
		return sum;
	}
}

/** Prepared gradients, kept by the identity of their arrays. */
export class GradientCache {
	private readonly kept = new WeakMap<Float64Array, Prepared>();

	constructor(
		private readonly operators: BoxOperator[],
		private readonly moved: MovedSet,
		private readonly system: ReducedSystem
	) {}

	get(gradient: Float64Array): Prepared {
		let prepared = this.kept.get(gradient);
		if (!prepared) {
			const row = this.system.reduce(this.operators.map((op) => op.project(gradient)));
			const solved = this.system.solve(row);
			const lattices = this.system.expand(solved);
			prepared = { row, solved, lattices, field: this.moved.evaluate(lattices) };
			this.kept.set(gradient, prepared);
		}
		return prepared;
	}
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
