import { cellCount, checkWritable, joined, patchNumbers, type WritableSurface, type WriteOptions } from './writable';
import { PATCH_NAMES } from './vtp-read';

const COUNT_BYTES = 8;
const littleEndian = new Uint8Array(new Uint16Array([1]).buffer)[0] === 1;

const escape = (text: string) =>
	text
		.replace(/[&<>"]/g, (c) => ({ '&': '&amp;', '<': '&lt;', '>': '&gt;', '"': '&quot;' })[c]!)
		.replace(/[\r\n\t]+/g, ' ');

interface Part {
	attributes: string;
	bytes: () => Uint8Array;
	size: number;
}

const bytesOf = (array: Float32Array | Float64Array | Int32Array | Uint8Array) =>
	new Uint8Array(array.buffer, array.byteOffset, array.byteLength);

/**
 * A VTK XML PolyData file in pieces: appended raw data with 64-bit counts in the machine's byte order; positions float32,
 * arrays float64, polygons as they came; the patch of each polygon as the cell array "patch", the names in the field
 * array "patch names".
 */
export function* vtpChunks(surface: WritableSurface, options: WriteOptions = {}): Generator<Uint8Array, void> {
	checkWritable(surface);
	const { positions, triangles, polygons } = surface;
	const cells = cellCount(surface);
	const { names, ofCell } = patchNumbers(surface);
	const patched = names.length > 1 || names.some((name) => name !== '');
	const corners = polygons ? polygons.corners : triangles;
	let offset = 0;
	const parts: Part[] = [];
	const add = (attributes: string, size: number, bytes: () => Uint8Array): string => {
		parts.push({ attributes, size, bytes });
		const tag = `<DataArray ${attributes} format="appended" offset="${offset}"/>`;
		offset += COUNT_BYTES + size;
		return tag;
	};
	const arrays = (on: 'point' | 'cell') =>
		(surface.arrays ?? [])
			.filter((array) => array.on === on)
			.map((array) =>
				add(
					`type="Float64" Name="${escape(array.name)}" NumberOfComponents="${array.components}"`,
					8 * array.values.length,
					() => bytesOf(array.values)
				)
			);
	const lines = [
		'<?xml version="1.0"?>',
		`<VTKFile type="PolyData" version="1.0" byte_order="${littleEndian ? 'LittleEndian' : 'BigEndian'}" header_type="UInt64">`
	];
	if (options.title) lines.push(`<!-- ${options.title.replace(/--+/g, '-').replace(/[<>\s]+/g, ' ')} -->`);
	lines.push('<PolyData>');
	if (patched) {
		// Strings are bytes, each ended by a zero.
		const text = new TextEncoder().encode(names.map((name) => `${name.replace(/\0/g, ' ')}\0`).join(''));
		lines.push(
			'<FieldData>',
			add(`type="String" Name="${PATCH_NAMES}" NumberOfTuples="${names.length}"`, text.length, () => text),
			'</FieldData>'
		);
	}
	lines.push(
		`<Piece NumberOfPoints="${positions.length / 3}" NumberOfVerts="0" NumberOfLines="0" NumberOfStrips="0" NumberOfPolys="${cells}">`,
		'<PointData>',
		...arrays('point'),
		'</PointData>',
		'<CellData>',
		...(patched ? [add('type="Int32" Name="patch"', 4 * cells, () => bytesOf(ofCell))] : []),
		...arrays('cell'),
		'</CellData>',
		'<Points>',
		add('type="Float32" Name="Points" NumberOfComponents="3"', 4 * positions.length, () => bytesOf(positions)),
		'</Points>',
		'<Polys>',
		add('type="Int32" Name="connectivity"', 4 * corners.length, () => bytesOf(Int32Array.from(corners))),
		add('type="Int32" Name="offsets"', 4 * cells, () =>
			bytesOf(
				polygons
					? Int32Array.from(polygons.offsets.subarray(1))
					: Int32Array.from({ length: cells }, (_, c) => 3 * c + 3)
			)
		),
		'</Polys>',
		'</Piece>',
		'</PolyData>',
		'<AppendedData encoding="raw">',
		'_'
	);
	const encoder = new TextEncoder();
	yield encoder.encode(lines.join('\n'));
	for (const [k, part] of parts.entries()) {
		const count = new DataView(new ArrayBuffer(COUNT_BYTES));
		count.setBigUint64(0, BigInt(part.size), littleEndian);
		yield new Uint8Array(count.buffer);
		yield part.bytes();
		options.checkpoint?.((k + 1) / parts.length);
	}
	yield encoder.encode('\n</AppendedData>\n</VTKFile>\n');
}

/** The whole file; see vtpChunks. */
export const writeVtp = (surface: WritableSurface, options: WriteOptions = {}): Uint8Array =>
	joined(vtpChunks(surface, options));
