/** Writers of formats that the product only reads, or of encodings that it never writes, with plain code for the tests. */
import { deflateSync } from 'node:zlib';
import { float32Text } from '$lib/morph';
import type { WritableSurface } from '$lib/formats/writable';

const encoder = new TextEncoder();

export function join(parts: (string | Uint8Array)[]): Uint8Array {
	const bytes = parts.map((part) => (typeof part === 'string' ? encoder.encode(part) : part));
	const out = new Uint8Array(bytes.reduce((n, b) => n + b.length, 0));
	let at = 0;
	for (const part of bytes) {
		out.set(part, at);
		at += part.length;
	}
	return out;
}

type Kind = 'float32' | 'float64' | 'int32' | 'int64';
const SIZE = { float32: 4, float64: 8, int32: 4, int64: 8 };

function pack(values: ArrayLike<number>, kind: Kind, little: boolean): Uint8Array {
	const view = new DataView(new ArrayBuffer(values.length * SIZE[kind]));
	for (let i = 0; i < values.length; i++) {
		const at = i * SIZE[kind];
		if (kind === 'float32') view.setFloat32(at, values[i], little);
		else if (kind === 'float64') view.setFloat64(at, values[i], little);
		else if (kind === 'int32') view.setInt32(at, values[i], little);
		else view.setBigInt64(at, BigInt(values[i]), little);
	}
	return new Uint8Array(view.buffer);
}

const text = (values: ArrayLike<number>, kind: Kind) =>
	Array.from(values, (v) => (kind === 'float32' ? float32Text(v) : String(v))).join(' ');

export function cellsOf(surface: WritableSurface): number[][] {
	const { polygons, triangles } = surface;
	if (!polygons)
		return Array.from({ length: triangles.length / 3 }, (_, t) => [...triangles.subarray(3 * t, 3 * t + 3)]);
	return Array.from({ length: polygons.offsets.length - 1 }, (_, p) => [
		...polygons.corners.subarray(polygons.offsets[p], polygons.offsets[p + 1])
	]);
}

/** Legacy PolyData after Kitware's description; 5.1 with OFFSETS and CONNECTIVITY and a METADATA block. */
export function vtkText(
	surface: WritableSurface,
	way: { binary: boolean; version: number; double: boolean }
): Uint8Array {
	const data = (values: ArrayLike<number>, kind: Kind) => (way.binary ? pack(values, kind, false) : text(values, kind));
	const cells = cellsOf(surface);
	const corners = cells.flat();
	const real: Kind = way.double ? 'float64' : 'float32';
	const parts: (string | Uint8Array)[] = [
		`# vtk DataFile Version ${way.version.toFixed(1)}\na title\n${way.binary ? 'BINARY' : 'ASCII'}\nDATASET POLYDATA\n`,
		`POINTS ${surface.positions.length / 3} ${way.double ? 'double' : 'float'}\n`,
		data(surface.positions, real),
		'\n'
	];
	if (way.version >= 5) {
		parts.push('METADATA\nINFORMATION 0\n\n');
		const ends = [0];
		for (const cell of cells) ends.push(ends[ends.length - 1] + cell.length);
		parts.push(`POLYGONS ${ends.length} ${corners.length}\nOFFSETS vtktypeint64\n`, data(ends, 'int64'));
		parts.push('\nCONNECTIVITY vtktypeint64\n', data(corners, 'int64'), '\n');
	} else {
		const flat = cells.flatMap((cell) => [cell.length, ...cell]);
		parts.push(`POLYGONS ${cells.length} ${flat.length}\n`, data(flat, 'int32'), '\n');
	}
	for (const on of ['cell', 'point'] as const) {
		const arrays = (surface.arrays ?? []).filter((a) => a.on === on);
		if (arrays.length === 0) continue;
		const tuples = on === 'cell' ? cells.length : surface.positions.length / 3;
		parts.push(`${on.toUpperCase()}_DATA ${tuples}\n`);
		arrays.forEach((array, k) => {
			// The same kind of data in each of the forms that it may take.
			if (array.components === 3) parts.push(`VECTORS ${array.name} double\n`);
			else if (k % 2 === 0) parts.push(`SCALARS ${array.name} double 1\nLOOKUP_TABLE default\n`);
			else parts.push(`FIELD FieldData 1\n${array.name} ${array.components} ${tuples} double\n`);
			parts.push(data(array.values, 'float64'), '\n');
		});
	}
	return join(parts);
}

export interface VtpWay {
	format: 'ascii' | 'binary' | 'raw' | 'base64';
	compressed: boolean;
	bigEndian: boolean;
	header: 4 | 8;
	/** Base64 without compression: the byte count as a run of its own. */
	separateCount: boolean;
	blockBytes: number;
	lineBreaks: boolean;
}

/** XML PolyData in any of its encodings. */
export function vtpText(surface: WritableSurface, way: VtpWay): Uint8Array {
	const little = !way.bigEndian;
	const words = (...values: number[]) => {
		const view = new DataView(new ArrayBuffer(way.header * values.length));
		values.forEach((value, k) => {
			if (way.header === 4) view.setUint32(4 * k, value, little);
			else view.setBigUint64(8 * k, BigInt(value), little);
		});
		return new Uint8Array(view.buffer);
	};
	const base64 = (bytes: Uint8Array) => {
		const run = Buffer.from(bytes).toString('base64');
		return way.lineBreaks ? run.replace(/.{1,20}/g, '$&\n ') : run;
	};
	/** Header and data of an array, as runs that base64 encodes apart. */
	const runs = (bytes: Uint8Array): Uint8Array[] => {
		if (!way.compressed) return way.separateCount ? [words(bytes.length), bytes] : [join([words(bytes.length), bytes])];
		const blocks: Uint8Array[] = [];
		for (let at = 0; at < bytes.length; at += way.blockBytes)
			blocks.push(deflateSync(bytes.subarray(at, at + way.blockBytes)));
		if (blocks.length === 0) return [words(0)];
		const header = words(blocks.length, way.blockBytes, bytes.length % way.blockBytes, ...blocks.map((b) => b.length));
		return [header, join(blocks)];
	};
	const appended: (string | Uint8Array)[] = [];
	let offset = 0;
	const array = (values: ArrayLike<number>, kind: Kind, attributes: string): string => {
		const type = { float32: 'Float32', float64: 'Float64', int32: 'Int32', int64: 'Int64' }[kind];
		const open = `<DataArray type="${type}" ${attributes}`;
		if (way.format === 'ascii') return `${open} format="ascii">\n${text(values, kind)}\n</DataArray>`;
		const parts = runs(pack(values, kind, little));
		if (way.format === 'binary') return `${open} format="binary">\n${parts.map(base64).join('')}\n</DataArray>`;
		const tag = `${open} format="appended" offset="${offset}"/>`;
		for (const part of parts.map((p) => (way.format === 'raw' ? p : base64(p)))) {
			appended.push(part);
			offset += part.length;
		}
		return tag;
	};
	const cells = cellsOf(surface);
	let end = 0;
	const ends = cells.map((cell) => (end += cell.length));
	const arrays = (on: string) =>
		(surface.arrays ?? [])
			.filter((a) => a.on === on)
			.map((a) => array(a.values, 'float64', `Name="${a.name}" NumberOfComponents="${a.components}"`))
			.join('\n');
	const xml = [
		`<?xml version="1.0"?>\n<VTKFile type="PolyData" version="1.0" byte_order="${little ? 'Little' : 'Big'}Endian"`,
		` header_type="UInt${8 * way.header}"${way.compressed ? ' compressor="vtkZLibDataCompressor"' : ''}>\n<PolyData>\n`,
		`<Piece NumberOfPoints="${surface.positions.length / 3}" NumberOfPolys="${cells.length}">\n`,
		`<PointData>${arrays('point')}</PointData>\n<CellData>${arrays('cell')}</CellData>\n`,
		`<Points>${array(surface.positions, 'float32', 'NumberOfComponents="3"')}</Points>\n`,
		`<Polys>${array(cells.flat(), 'int64', 'Name="connectivity"')}${array(ends, 'int32', 'Name="offsets"')}</Polys>\n`,
		'</Piece>\n</PolyData>\n'
	].join('');
	if (appended.length === 0) return join([xml, '</VTKFile>']);
	const encoding = way.format === 'raw' ? 'raw' : 'base64';
	return join([xml, `<AppendedData encoding="${encoding}">\n_`, ...appended, '\n</AppendedData>\n</VTKFile>']);
}
