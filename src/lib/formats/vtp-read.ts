import { lineAt, shown, syntax, unsupported } from './errors';
import { limitsOf } from './assemble';
import { cellCount, surfaceOf, type CellBlock, type PolyData } from './polydata';
import type { NumberArray } from './scalars';
import { nameText } from './text';
import type { NamedArray, ReadOptions, SurfaceFile } from './types';
import { XML_TYPES, compressorOf, readXmlNumbers, type XmlFile } from './vtp-arrays';
import { readXml, type XmlNode } from './xml';

const child = (node: XmlNode, name: string) => node.children.find((c) => c.name === name);
const MAX_COMPONENTS = 1000;
/** Name of the field array in which our own writer keeps the patches' names. */
export const PATCH_NAMES = 'patch names';

interface Piece {
	points: NumberArray;
	pointCount: number;
	cells: Record<'Verts' | 'Lines' | 'Polys' | 'Strips', CellBlock | null>;
	arrays: NamedArray[];
}

/** Reads one XML PolyData file; see readVtp. */
class XmlReader {
	private readonly data: PolyData;

	constructor(
		private readonly file: XmlFile,
		private readonly options: ReadOptions
	) {
		this.data = {
			format: 'vtp',
			encoding: 'ascii',
			points: new Float32Array(0),
			pointsExact: true,
			pointsByte: 0,
			vertexCells: 0,
			lineCells: 0,
			polys: null,
			strips: null,
			arrays: [],
			patchNames: null,
			notes: []
		};
	}

	private fault(node: XmlNode, text: string) {
		const line = lineAt(this.file.bytes, node.byte);
		return syntax(`Line ${line}: ${text}`, { byte: node.byte, line });
	}

	private count(node: XmlNode, attribute: string): number {
		const text = node.attributes[attribute] ?? '0';
		if (!/^\s*\d{1,15}\s*$/.test(text)) throw this.fault(node, `${attribute} is "${shown(text)}", no count.`);
		return Number(text);
	}

	read(poly: XmlNode): SurfaceFile {
		const pieces = poly.children.filter((c) => c.name === 'Piece');
		if (pieces.length === 0) throw this.fault(poly, 'the PolyData has no <Piece>.');
		const field = child(poly, 'FieldData');
		if (field) this.readPatchNames(field);
		this.join(pieces.map((piece) => this.readPiece(piece)));
		return surfaceOf(this.data, this.options);
	}

	private readPatchNames(field: XmlNode): void {
		const node = field.children.find((c) => c.attributes.Name === PATCH_NAMES && c.attributes.type === 'String');
		if (!node) return;
		// Strings are bytes, each ended by a zero.
		const { values } = readXmlNumbers(this.file, { ...node, attributes: { ...node.attributes, type: 'UInt8' } }, null);
		const names = new Map<number, string>();
		let from = 0;
		values.forEach((byte, i) => {
			if (byte !== 0) return;
			names.set(names.size, nameText(Uint8Array.from(values.subarray(from, i))));
			from = i + 1;
		});
		this.data.patchNames = names;
	}

	private readPiece(piece: XmlNode): Piece {
		const pointCount = this.count(piece, 'NumberOfPoints');
		const pointsNode = child(piece, 'Points')?.children.find((c) => c.name === 'DataArray');
		let points: NumberArray = new Float32Array(0);
		if (pointsNode) {
			const { values, encoding, worst } = readXmlNumbers(this.file, pointsNode, 3 * pointCount);
			points = values;
			this.data.encoding = encoding;
			this.data.pointsExact = encoding !== 'ascii' || worst > 0;
			this.data.pointsByte = pointsNode.byte;
		} else if (pointCount > 0) throw this.fault(piece, `the piece has ${pointCount} points but no <Points>.`);
		const cells = {
			Verts: this.readCells(piece, 'Verts'),
			Lines: this.readCells(piece, 'Lines'),
			Polys: this.readCells(piece, 'Polys'),
			Strips: this.readCells(piece, 'Strips')
		};
		const total = Object.values(cells).reduce((sum, block) => sum + cellCount(block), 0);
		const arrays: NamedArray[] = [];
		this.readArrays(child(piece, 'PointData'), 'point', pointCount, arrays);
		this.readArrays(child(piece, 'CellData'), 'cell', total, arrays);
		return { points, pointCount, cells, arrays };
	}

	private readCells(piece: XmlNode, kind: string): CellBlock | null {
		const count = this.count(piece, `NumberOf${kind}`);
		const node = child(piece, kind);
		if (count === 0) return null;
		const part = (name: string) => {
			const found = node?.children.find((c) => c.name === 'DataArray' && c.attributes.Name?.toLowerCase() === name);
			if (!found) throw this.fault(node ?? piece, `<${kind}> lacks its array "${name}".`);
			return found;
		};
		const ends = readXmlNumbers(this.file, part('offsets'), count).values;
		const { values: connectivity } = readXmlNumbers(this.file, part('connectivity'), null);
		// XML offsets begin with the end of the first cell.
		const offsets = new Float64Array(count + 1);
		offsets.set(ends, 1);
		return { offsets, connectivity, byte: node!.byte };
	}

	private readArrays(data: XmlNode | undefined, on: NamedArray['on'], tuples: number, out: NamedArray[]): void {
		for (const node of data?.children ?? []) {
			if (node.name !== 'DataArray' || !XML_TYPES[node.attributes.type ?? '']) continue;
			const components = this.count(node, 'NumberOfComponents') || 1;
			if (components > MAX_COMPONENTS) throw this.fault(node, `the array has ${components} components.`);
			const name = node.attributes.Name ?? `${on} array ${out.length + 1}`;
			if (name === data!.attributes.Normals) continue;
			const { values } = readXmlNumbers(this.file, node, components * tuples);
			out.push({ name, on, components, values: values instanceof Float64Array ? values : Float64Array.from(values) });
		}
	}

	/** One surface from the pieces; arrays that not all of them have are left out and said so. */
	private join(pieces: Piece[]): void {
		const { data } = this;
		if (pieces.length === 1) {
			const [piece] = pieces;
			data.points = piece.points;
			data.arrays = piece.arrays;
			data.vertexCells = cellCount(piece.cells.Verts);
			data.lineCells = cellCount(piece.cells.Lines);
			data.polys = piece.cells.Polys;
			data.strips = piece.cells.Strips;
			return;
		}
		data.points = concat(pieces.map((p) => p.points));
		const block = (kind: 'Polys' | 'Strips'): CellBlock => {
			const offsets: NumberArray[] = [new Float64Array(1)];
			const connectivity: NumberArray[] = [];
			let corner = 0;
			let point = 0;
			let byte = 0;
			for (const piece of pieces) {
				const cells = piece.cells[kind];
				if (cells) {
					byte ||= cells.byte;
					const [c, p, n] = [corner, point, piece.pointCount];
					offsets.push(Float64Array.from(cells.offsets.subarray(1), (at) => at + c));
					// A point beyond its own piece must not become one of the next.
					connectivity.push(Float64Array.from(cells.connectivity, (i) => (i >= 0 && i < n ? i + p : -1)));
					corner += cells.connectivity.length;
				}
				point += piece.pointCount;
			}
			return { offsets: concat(offsets), connectivity: concat(connectivity), byte };
		};
		data.polys = block('Polys');
		data.strips = block('Strips');
		const [first] = pieces;
		for (const array of first.arrays) {
			const parts = pieces.map((piece) =>
				piece.arrays.find((a) => a.name === array.name && a.on === array.on && a.components === array.components)
			);
			if (parts.some((part) => !part)) {
				data.notes.push({
					code: 'dropped',
					text: `The array "${shown(array.name)}" is not in every piece and was left out.`
				});
				continue;
			}
			const values = parts.map((part, k) => (array.on === 'point' ? part!.values : surfaceCells(pieces[k], part!)));
			data.arrays.push({ ...array, values: concat(cellOrder(array, pieces, values)) });
		}
		data.notes.push({
			code: 'odd-structure',
			text: `The file has ${pieces.length} pieces, which were joined in their order.`
		});
	}
}

/** Without the values of vertices and lines: joined pieces keep polygons and strips only. */
function surfaceCells(piece: Piece, array: NamedArray): Float64Array {
	return array.values.subarray(array.components * (cellCount(piece.cells.Verts) + cellCount(piece.cells.Lines)));
}

/** Cell values of all pieces' polygons, then of all their strips, as the joined cells stand. */
function cellOrder(array: NamedArray, pieces: Piece[], values: Float64Array[]): Float64Array[] {
	if (array.on === 'point') return values;
	const polys = pieces.map((piece) => array.components * cellCount(piece.cells.Polys));
	return [...values.map((v, k) => v.subarray(0, polys[k])), ...values.map((v, k) => v.subarray(polys[k]))];
}

function concat(parts: NumberArray[]): Float64Array {
	const out = new Float64Array(parts.reduce((sum, part) => sum + part.length, 0));
	let at = 0;
	for (const part of parts) {
		out.set(part, at);
		at += part.length;
	}
	return out;
}

/**
 * Reads a VTK XML PolyData file (.vtp): ASCII, inline base64, appended base64 and raw, uncompressed or zlib in any number
 * of blocks, 32- and 64-bit byte counts, both byte orders, several pieces; point and cell arrays.
 * @param bytes the whole file, borrowed
 * @throws MorphError file-syntax, file-truncated, file-non-finite, file-empty, file-unsupported, file-too-large
 */
export function readVtp(bytes: Uint8Array, options: ReadOptions = {}): SurfaceFile {
	const { root, stopped } = readXml(bytes, 'AppendedData');
	const place = { byte: root.byte, line: lineAt(bytes, root.byte) };
	if (root.name !== 'VTKFile')
		throw syntax(`Line ${place.line}: expected <VTKFile>, found <${shown(root.name)}>.`, place);
	const kind = root.attributes.type ?? '';
	if (kind !== 'PolyData') {
		throw unsupported(
			kind === 'PPolyData'
				? 'The file only lists the pieces of a parallel PolyData.'
				: `The VTK file holds a ${shown(kind)}, not a surface.`,
			kind === 'PPolyData'
				? 'Merge the pieces and save them as one .vtp file.'
				: 'Extract the surface first and save it as PolyData (.vtp).',
			place
		);
	}
	const poly = child(root, 'PolyData');
	if (!poly) throw syntax(`Line ${place.line}: <VTKFile> has no <PolyData>.`, place);
	const order = root.attributes.byte_order ?? 'LittleEndian';
	if (order !== 'LittleEndian' && order !== 'BigEndian') {
		throw syntax(`Line ${place.line}: the byte order is "${shown(order)}".`, place);
	}
	const header = root.attributes.header_type ?? 'UInt32';
	if (header !== 'UInt32' && header !== 'UInt64') {
		throw syntax(`Line ${place.line}: the type of the byte counts is "${shown(header)}".`, place);
	}
	const appended = stopped ?? child(root, 'AppendedData');
	let appendedAt = -1;
	let appendedEnd = bytes.length;
	const appendedRaw = appended?.attributes.encoding === 'raw';
	if (appended) {
		let at = appended.textFrom;
		while (at < bytes.length && bytes[at] <= 32) at++;
		if (bytes[at] !== 95)
			throw syntax(`Line ${lineAt(bytes, at)}: the appended data do not begin with "_".`, {
				byte: at,
				line: lineAt(bytes, at)
			});
		appendedAt = at + 1;
		if (!appendedRaw) {
			let end = appendedAt;
			while (end < bytes.length && bytes[end] !== 60) end++;
			appendedEnd = end;
		}
	}
	const file: XmlFile = {
		bytes,
		little: order === 'LittleEndian',
		header: header === 'UInt64' ? 'uint64' : 'uint32',
		compressed: compressorOf(root.attributes.compressor),
		appendedAt,
		appendedEnd,
		appendedRaw,
		maxBytes: limitsOf(options).maxBytes
	};
	return new XmlReader(file, options).read(poly);
}
