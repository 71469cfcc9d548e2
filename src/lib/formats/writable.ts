import { MorphError, type Patch, type WithCheckpoint } from '$lib/morph';
import type { NamedArray, Polygons } from './types';

/** What the writers need of a surface; all borrowed. */
export interface WritableSurface {
	/** N x 3, in the unit of the file to be. */
	positions: Float32Array;
	/** F x 3 */
	triangles: Uint32Array;
	patches: Patch[];
	/** Polygons as they came, whose triangles follow each other as in SurfaceFile; default: the triangles. */
	polygons?: Polygons | null;
	/** Cell arrays have one tuple per polygon where polygons are given, else per triangle. */
	arrays?: NamedArray[];
}

export interface WriteOptions extends WithCheckpoint {
	/** A word on what the file is, for formats that have room for it. */
	title?: string;
}

export const cellCount = (surface: WritableSurface) =>
	surface.polygons ? surface.polygons.offsets.length - 1 : surface.triangles.length / 3;

/** Runs of cells (polygons or triangles) with their patch. */
export function cellRuns(surface: WritableSurface): { name: string; first: number; end: number }[] {
	const { patches, polygons } = surface;
	const runs: { name: string; first: number; end: number }[] = [];
	let cell = 0;
	for (const patch of patches) {
		const end = patch.firstTriangle + patch.triangleCount;
		const first = cell;
		if (!polygons) cell = end;
		// Triangles before polygon p: its corners before less two for each polygon.
		else while (cell < polygons.offsets.length - 1 && polygons.offsets[cell + 1] - 2 * (cell + 1) <= end) cell++;
		if (cell > first) runs.push({ name: patch.name, first, end: cell });
	}
	return runs;
}

/** Numbers of the patches' names, equal names alike, in order of appearance; and the number of each cell. */
export function patchNumbers(surface: WritableSurface): { names: string[]; ofCell: Int32Array } {
	const names: string[] = [];
	const known = new Map<string, number>();
	const ofCell = new Int32Array(cellCount(surface));
	for (const run of cellRuns(surface)) {
		let number = known.get(run.name);
		if (number === undefined) {
			number = names.push(run.name) - 1;
			known.set(run.name, number);
		}
		ofCell.fill(number, run.first, run.end);
	}
	return { names, ofCell };
}

/** @throws MorphError mesh-shape when patches, polygons or arrays do not fit the triangles */
export function checkWritable(surface: WritableSurface): void {
	const triangleCount = surface.triangles.length / 3;
	const refuse = (message: string, mend: string): never => {
		throw new MorphError('mesh-shape', message, mend);
	};
	let at = 0;
	for (const patch of surface.patches) {
		if (patch.firstTriangle !== at) break;
		at += patch.triangleCount;
	}
	if (at !== triangleCount) {
		refuse(
			`The patches end at triangle ${at}, but the mesh has ${triangleCount}.`,
			'Give patches that cover all triangles in their order.'
		);
	}
	if (surface.polygons) {
		const { offsets, corners } = surface.polygons;
		if (corners.length - 2 * (offsets.length - 1) !== triangleCount) {
			refuse('The polygons and the triangles do not fit together.', 'Give the polygons that the triangles came from.');
		}
	}
	for (const array of surface.arrays ?? []) {
		const tuples = array.on === 'point' ? surface.positions.length / 3 : cellCount(surface);
		if (array.values.length !== tuples * array.components) {
			refuse(
				`The ${array.on} array "${array.name}" has ${array.values.length} numbers for ${tuples} ${array.on}s of ${array.components}.`,
				'Give one tuple for each.'
			);
		}
	}
}

/** Joins the pieces of a file. */
export function joined(chunks: Iterable<Uint8Array>): Uint8Array {
	const parts = [...chunks];
	const out = new Uint8Array(parts.reduce((sum, part) => sum + part.length, 0));
	let at = 0;
	for (const part of parts) {
		out.set(part, at);
		at += part.length;
	}
	return out;
}

export const CHUNK_ITEMS = 1 << 16;

/** Calls `line` for items first..end - 1 and yields their text in pieces. */
export function* textChunks(first: number, end: number, line: (index: number) => string): Generator<Uint8Array, void> {
	const encoder = new TextEncoder();
	for (let from = first; from < end; from += CHUNK_ITEMS) {
		const to = Math.min(end, from + CHUNK_ITEMS);
		const lines: string[] = [];
		for (let i = from; i < to; i++) lines.push(line(i));
		yield encoder.encode(lines.join(''));
	}
}
