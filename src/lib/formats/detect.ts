import { MorphError } from '$lib/morph';
import { shown } from './errors';
import { latin } from './text';
import type { SurfaceFormat } from './types';

const HEAD = 4096;
const STL_RECORD = 50;
const STL_START = 84;
const OBJ_LINE = /^\s*(v|vt|vn|f|fo|g|o|s|l|p|mtllib|usemtl)(\s|$)/;

/** Formats that are recognised only to be refused by their names. */
const STRANGERS: [RegExp, string][] = [
	[/^\s*ISO-10303-21/, 'a STEP file, which holds exact geometry'],
	[/^.{72}S\s*1/s, 'an IGES file, which holds exact geometry'],
	[/^OFF\b|^(ST|C|N|4)*n?OFF\s/, 'an OFF file'],
	[/^glTF/, 'a binary glTF file'],
	[/^\s*\{/, 'a JSON file'],
	[/^\$MeshFormat/, 'a Gmsh file'],
	[/^.HDF\r\n/s, 'an HDF5 file'],
	[/^CDF/, 'a NetCDF file'],
	[/^#!TDV/, 'a binary Tecplot file'],
	[/^\s*(TITLE|VARIABLES)\s*=/i, 'a Tecplot file'],
	[/^%PDF/, 'a PDF document'],
	[/^\x89PNG|^\xff\xd8\xff/, 'a picture'],
	[/^AC10\d\d|^\s*0\r?\n\s*SECTION/, 'a drawing (DWG or DXF)'],
	[/^Rar!|^7z\xbc|^\xfd7zXZ|^BZh/, 'an archive of another kind than gzip and zip'],
	[/^\$\s*.*NASTRAN|^(SOL|CEND|BEGIN BULK)\b/i, 'a Nastran bulk data file']
];

const KNOWN =
	'Give the surface as STL, OBJ, PLY, VTK legacy (.vtk) or VTK XML PolyData (.vtp), also gzipped or zipped.';

export const extensionOf = (filename: string) => /\.([a-z0-9]+)$/i.exec(filename)?.[1].toLowerCase() ?? '';

export const SURFACE_ENDINGS = /\.(stl|stla|stlb|obj|ply|vtk|vtp)(\.gz)?$/i;

/** Bytes of a text as UTF-8: UTF-16 (with its mark) is converted; everything else is returned as it is. */
export function toUtf8(bytes: Uint8Array): { bytes: Uint8Array; converted: boolean } {
	const little = bytes[0] === 0xff && bytes[1] === 0xfe;
	const big = bytes[0] === 0xfe && bytes[1] === 0xff;
	if (!little && !big) return { bytes, converted: false };
	// The mark stands before text only; a binary STL may begin with any bytes.
	const head = bytes.subarray(2, 66);
	let zeros = 0;
	for (let i = little ? 1 : 0; i < head.length; i += 2) if (head[i] === 0) zeros++;
	if (zeros < head.length / 4) return { bytes, converted: false };
	const text = new TextDecoder(little ? 'utf-16le' : 'utf-16be').decode(bytes);
	return { bytes: new TextEncoder().encode(text), converted: true };
}

/**
 * Which format the bytes are, by their content first and the name's ending second.
 * @throws MorphError file-unknown
 */
export function detectSurface(bytes: Uint8Array, filename: string): SurfaceFormat {
	if (bytes.length >= STL_START) {
		const count = new DataView(bytes.buffer, bytes.byteOffset, bytes.byteLength).getUint32(80, true);
		if (count > 0 && STL_START + STL_RECORD * count === bytes.length) return 'stl';
	}
	const raw = latin(bytes, 0, Math.min(bytes.length, HEAD));
	const head = raw.replace(/^\xef\xbb\xbf/, '');
	if (/^ply[ \t]*[\r\n]/.test(head)) return 'ply';
	if (/^#\s*vtk\s+DataFile/i.test(head)) return 'vtk';
	if (/^\s*(<\?xml[^>]*>\s*)?(<!--.*?-->\s*)*<VTKFile\b/s.test(head)) return 'vtp';
	if (/^\s*solid\b/i.test(head) && (/\bfacet\b|\bendsolid\b/i.test(head) || !OBJ_LINE.test(head))) return 'stl';
	const ending = extensionOf(filename);
	for (const [pattern, what] of STRANGERS) {
		if (!pattern.test(head)) continue;
		if (ending === 'stl' && /^\s*\{/.test(head)) continue;
		throw new MorphError('file-unknown', `"${shown(filename)}" is ${what}, which is not read here.`, KNOWN, {
			byte: 0
		});
	}
	const text = !head.includes('\0');
	const lines = head.split(/[\r\n]+/).filter((line) => !/^\s*(#|$)/.test(line));
	const objLines = lines.filter((line) => OBJ_LINE.test(line)).length;
	if (text && lines.length > 0 && objLines >= 0.8 * lines.length) return 'obj';
	if (ending === 'stl' || ending === 'stla' || ending === 'stlb') return 'stl';
	if (ending === 'obj' && text) return 'obj';
	if (ending === 'ply' || ending === 'vtk' || ending === 'vtp') return ending;
	throw new MorphError(
		'file-unknown',
		`"${shown(filename)}" is in no format that is known here: it begins with "${shown(raw.slice(0, 40))}".`,
		KNOWN,
		{ byte: 0 }
	);
}
