import { float32Text } from '$lib/morph';
import {
	CHUNK_ITEMS,
	cellCount,
	checkWritable,
	joined,
	patchNumbers,
	textChunks,
	type WritableSurface,
	type WriteOptions
} from './writable';

export interface WritePlyOptions extends WriteOptions {
	/** Default 'binary' (little-endian). */
	encoding?: 'binary' | 'ascii';
}

const word = (name: string) => name.trim().replace(/\s+/g, '_') || 'array';
const AXES = ['x', 'y', 'z'];
const MAX_UCHAR = 255;

interface Column {
	name: string;
	values: Float64Array;
	stride: number;
	offset: number;
}

/** Columns of the arrays, with names that neither repeat nor mean something else. */
function columnsOf(surface: WritableSurface, on: 'point' | 'cell', taken: string[]): Column[] {
	const used = new Set(taken);
	const out: Column[] = [];
	for (const array of surface.arrays ?? []) {
		if (array.on !== on) continue;
		for (let c = 0; c < array.components; c++) {
			const stem = word(array.name);
			let name = array.components === 1 ? stem : array.components === 3 ? `${stem}_${AXES[c]}` : `${stem}_${c}`;
			while (used.has(name)) name += '_';
			used.add(name);
			out.push({ name, values: array.values, stride: array.components, offset: c });
		}
	}
	return out;
}

/**
 * A PLY in pieces: float32 positions, arrays as float64 properties, polygons as they came, the patch of each face as its
 * property "patch" with the names in comments ("patch NUMBER NAME").
 */
export function* plyChunks(surface: WritableSurface, options: WritePlyOptions = {}): Generator<Uint8Array, void> {
	checkWritable(surface);
	const { positions: p, triangles, polygons } = surface;
	const vertexCount = p.length / 3;
	const cells = cellCount(surface);
	const ascii = options.encoding === 'ascii';
	const point = columnsOf(surface, 'point', AXES);
	const { names, ofCell } = patchNumbers(surface);
	const patched = names.length > 1 || names.some((name) => name !== '');
	const cell = columnsOf(surface, 'cell', ['vertex_indices', ...(patched ? ['patch'] : [])]);
	let largest = 3;
	if (polygons)
		for (let c = 0; c < cells; c++) largest = Math.max(largest, polygons.offsets[c + 1] - polygons.offsets[c]);
	const countType = largest <= MAX_UCHAR ? 'uchar' : 'int';
	const head = [
		'ply',
		`format ${ascii ? 'ascii' : 'binary_little_endian'} 1.0`,
		...(options.title ? [`comment ${options.title.replace(/\s+/g, ' ')}`] : []),
		...(patched ? names.map((name, k) => `comment patch ${k} ${name.replace(/\s+/g, ' ')}`) : []),
		`element vertex ${vertexCount}`,
		...AXES.map((axis) => `property float ${axis}`),
		...point.map((c) => `property double ${c.name}`),
		`element face ${cells}`,
		`property list ${countType} int vertex_indices`,
		...(patched ? ['property int patch'] : []),
		...cell.map((c) => `property double ${c.name}`),
		'end_header\n'
	];
	yield new TextEncoder().encode(head.join('\n'));
	const cornersOf = (c: number): [ArrayLike<number>, number, number] =>
		polygons ? [polygons.corners, polygons.offsets[c], polygons.offsets[c + 1]] : [triangles, 3 * c, 3 * c + 3];
	const at = (column: Column, i: number) => column.values[column.stride * i + column.offset];
	if (ascii) {
		yield* textChunks(0, vertexCount, (v) => {
			let line = `${float32Text(p[3 * v])} ${float32Text(p[3 * v + 1])} ${float32Text(p[3 * v + 2])}`;
			for (const column of point) line += ` ${at(column, v)}`;
			return `${line}\n`;
		});
		yield* textChunks(0, cells, (c) => {
			const [corners, from, to] = cornersOf(c);
			let line = `${to - from}`;
			for (let i = from; i < to; i++) line += ` ${corners[i]}`;
			if (patched) line += ` ${ofCell[c]}`;
			for (const column of cell) line += ` ${at(column, c)}`;
			return `${line}\n`;
		});
		return;
	}
	const vertexBytes = 12 + 8 * point.length;
	for (let first = 0; first < vertexCount; first += CHUNK_ITEMS) {
		const end = Math.min(vertexCount, first + CHUNK_ITEMS);
		const chunk = new Uint8Array(vertexBytes * (end - first));
		const view = new DataView(chunk.buffer);
		let o = 0;
		for (let v = first; v < end; v++) {
			for (let d = 0; d < 3; d++, o += 4) view.setFloat32(o, p[3 * v + d], true);
			for (const column of point) {
				view.setFloat64(o, at(column, v), true);
				o += 8;
			}
		}
		yield chunk;
	}
	options.checkpoint?.(0.5);
	const countBytes = countType === 'uchar' ? 1 : 4;
	const tail = (patched ? 4 : 0) + 8 * cell.length;
	for (let first = 0; first < cells; first += CHUNK_ITEMS) {
		const end = Math.min(cells, first + CHUNK_ITEMS);
		const corners = polygons ? polygons.offsets[end] - polygons.offsets[first] : 3 * (end - first);
		const chunk = new Uint8Array((countBytes + tail) * (end - first) + 4 * corners);
		const view = new DataView(chunk.buffer);
		let o = 0;
		for (let c = first; c < end; c++) {
			const [list, from, to] = cornersOf(c);
			if (countBytes === 1) view.setUint8(o, to - from);
			else view.setInt32(o, to - from, true);
			o += countBytes;
			for (let i = from; i < to; i++, o += 4) view.setInt32(o, list[i], true);
			if (patched) {
				view.setInt32(o, ofCell[c], true);
				o += 4;
			}
			for (const column of cell) {
				view.setFloat64(o, at(column, c), true);
				o += 8;
			}
		}
		yield chunk;
		options.checkpoint?.(0.5 + (0.5 * end) / cells);
	}
}

/** The whole file; see plyChunks. */
export const writePly = (surface: WritableSurface, options: WritePlyOptions = {}): Uint8Array =>
	joined(plyChunks(surface, options));
