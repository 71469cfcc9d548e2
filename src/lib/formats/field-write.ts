import { float32Text, MorphError } from '$lib/morph';
import type { NamedArray } from './types';
import { joined, textChunks } from './writable';

export interface DisplacementField {
	/** N x 3, the parent's positions in the file's unit; borrowed. */
	before: Float32Array;
	/** N x 3, the child's. */
	after: Float32Array;
}

function check({ before, after }: DisplacementField): void {
	if (before.length === after.length) return;
	throw new MorphError(
		'mesh-shape',
		`The shapes have ${before.length / 3} and ${after.length / 3} vertices: there is no displacement between them.`,
		'Choose two shapes of one mesh.'
	);
}

/** after - before as a point array, N x 3, exact in float64. */
export function displacementArray(field: DisplacementField, name = 'displacement'): NamedArray {
	check(field);
	const values = new Float64Array(field.before.length);
	for (let i = 0; i < values.length; i++) values[i] = field.after[i] - field.before[i];
	return { name, on: 'point', components: 3, values };
}

/**
 * The displacement of every vertex as CSV, in file order and in the file's unit: vertex (from 0), x, y, z before, dx, dy, dz.
 * Positions are the shortest text of their float32, displacements of their float64 difference, so that the sum is exact.
 */
export function* displacementCsvChunks(field: DisplacementField): Generator<Uint8Array, void> {
	check(field);
	const { before: b, after: a } = field;
	yield new TextEncoder().encode('vertex,x,y,z,dx,dy,dz\n');
	yield* textChunks(0, b.length / 3, (v) => {
		const i = 3 * v;
		return (
			`${v},${float32Text(b[i])},${float32Text(b[i + 1])},${float32Text(b[i + 2])},` +
			`${a[i] - b[i]},${a[i + 1] - b[i + 1]},${a[i + 2] - b[i + 2]}\n`
		);
	});
}

/** The whole file; see displacementCsvChunks. */
export const writeDisplacementCsv = (field: DisplacementField): Uint8Array => joined(displacementCsvChunks(field));
