import type { BoxOperator } from './operator';

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
}
