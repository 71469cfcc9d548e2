import { float32Text } from '$lib/morph';
import { cellRuns, checkWritable, joined, textChunks, type WritableSurface, type WriteOptions } from './writable';

/** A group's name on one line, without what an OBJ would take for the end or a continuation. */
const groupName = (name: string) =>
	name
		.replace(/\s+/g, ' ')
		.replace(/(^| )#/g, '$1_')
		.replace(/\\/g, '/')
		.trim();

/** A Wavefront OBJ in pieces: vertices, then the polygons as they came with a group (g) for each patch. */
export function* objChunks(surface: WritableSurface, options: WriteOptions = {}): Generator<Uint8Array, void> {
	checkWritable(surface);
	const { positions: p, triangles, polygons } = surface;
	const encoder = new TextEncoder();
	if (options.title) yield encoder.encode(`# ${options.title.replace(/\s+/g, ' ')}\n`);
	yield* textChunks(
		0,
		p.length / 3,
		(v) => `v ${float32Text(p[3 * v])} ${float32Text(p[3 * v + 1])} ${float32Text(p[3 * v + 2])}\n`
	);
	options.checkpoint?.(0.4);
	const face = (c: number) => {
		if (!polygons) return `f ${triangles[3 * c] + 1} ${triangles[3 * c + 1] + 1} ${triangles[3 * c + 2] + 1}\n`;
		let line = 'f';
		for (let i = polygons.offsets[c]; i < polygons.offsets[c + 1]; i++) line += ` ${polygons.corners[i] + 1}`;
		return `${line}\n`;
	};
	const runs = cellRuns(surface);
	const named = runs.length > 1 || runs.some((run) => run.name !== '');
	for (const run of runs) {
		if (named) yield encoder.encode(`g ${groupName(run.name)}`.trimEnd() + '\n');
		yield* textChunks(run.first, run.end, face);
		options.checkpoint?.(0.4 + (0.6 * run.end) / runs[runs.length - 1].end);
	}
}

/** The whole file; see objChunks. */
export const writeObj = (surface: WritableSurface, options: WriteOptions = {}): Uint8Array =>
	joined(objChunks(surface, options));
