import { shown, syntax, truncated, unsupported } from './errors';
import type { ScalarType } from './scalars';
import { latin, nameText } from './text';

export interface PlyProperty {
	name: string;
	type: ScalarType;
	/** Type of the count of a list, or null. */
	list: ScalarType | null;
}

export interface PlyElement {
	name: string;
	count: number;
	properties: PlyProperty[];
	/** Line of its declaration. */
	line: number;
	byte: number;
}

export interface PlyHeader {
	encoding: 'ascii' | 'binary-little-endian' | 'binary-big-endian';
	elements: PlyElement[];
	comments: string[];
	/** First byte of the data. */
	dataAt: number;
	/** Line of the first data, for ASCII. */
	dataLine: number;
}

/** Type names of Turk's description, and those with their size, as later programs write them. */
const TYPES: Record<string, ScalarType> = {
	char: 'int8',
	int8: 'int8',
	uchar: 'uint8',
	uint8: 'uint8',
	short: 'int16',
	int16: 'int16',
	ushort: 'uint16',
	uint16: 'uint16',
	int: 'int32',
	int32: 'int32',
	uint: 'uint32',
	uint32: 'uint32',
	float: 'float32',
	float32: 'float32',
	double: 'float64',
	float64: 'float64',
	int64: 'int64',
	uint64: 'uint64',
	longlong: 'int64',
	ulonglong: 'uint64'
};

const ENCODINGS: Record<string, PlyHeader['encoding']> = {
	ascii: 'ascii',
	binary_little_endian: 'binary-little-endian',
	binary_big_endian: 'binary-big-endian'
};
const MAX_HEADER = 1 << 20;
export const LIST_OF_CORNERS = /^vertex_ind(ex|ices)$/;

/** Reads the header after Turk 1994 ("The PLY polygon file format"); see readPly. */
export function readPlyHeader(bytes: Uint8Array): PlyHeader {
	const elements: PlyElement[] = [];
	const comments: string[] = [];
	let encoding: PlyHeader['encoding'] | null = null;
	let at = 0;
	let line = 0;
	// Only the first line can tell whether CR ends lines alone: behind end_header a line feed may be data.
	const firstBreak = bytes.findIndex((b) => b === 10 || b === 13);
	const lone = firstBreak >= 0 && bytes[firstBreak] === 13 && bytes[firstBreak + 1] !== 10;
	for (;;) {
		const from = at;
		while (at < bytes.length && at < MAX_HEADER && bytes[at] !== 10 && !(lone && bytes[at] === 13)) at++;
		line++;
		if (at >= bytes.length || at >= MAX_HEADER) {
			// A header may be the whole file, when every element is empty.
			if (!/^\s*end_header\s*$/.test(latin(bytes, from, Math.min(at, from + 80)))) {
				throw truncated('The file ends inside the PLY header: there is no "end_header".', { line, byte: at });
			}
		}
		const text = latin(bytes, from, at).trim();
		at++;
		const place = { line, byte: from };
		const words = text.split(/\s+/);
		const bad = (what: string) => syntax(`Line ${line}: ${what}, found "${shown(text)}".`, place);
		if (line === 1) {
			if (text !== 'ply') throw bad('expected "ply"');
			continue;
		}
		if (words[0] === 'end_header') break;
		if (words[0] === 'comment' || words[0] === 'obj_info') {
			comments.push(nameText(bytes.subarray(from, at - 1)).replace(/^\s*\w+\s?/, ''));
		} else if (words[0] === 'format') {
			encoding = ENCODINGS[words[1]?.toLowerCase()] ?? null;
			if (!encoding) throw bad('expected format ascii, binary_little_endian or binary_big_endian');
		} else if (words[0] === 'element') {
			if (words.length !== 3 || !/^\d{1,15}$/.test(words[2])) throw bad('expected "element name count"');
			if (elements.length >= 100) throw bad('more than 100 elements');
			elements.push({ name: words[1], count: Number(words[2]), properties: [], line, byte: from });
		} else if (words[0] === 'property') {
			const element = elements[elements.length - 1];
			if (!element) throw bad('expected an element before its properties');
			if (element.properties.length >= 1000) throw bad('more than 1000 properties');
			const isList = words[1] === 'list';
			const types = (isList ? words.slice(2, 4) : words.slice(1, 2)).map((w) => TYPES[w?.toLowerCase()]);
			const name = words[isList ? 4 : 2];
			if (types.some((t) => !t) || !name) throw bad('expected "property type name" or "property list type type name"');
			if (isList && element.name === 'vertex' && LIST_OF_CORNERS.test(name)) {
				throw syntax(
					`Line ${line}: a list of corners belongs to the vertices: the line "element face ..." before it is missing.`,
					place,
					'Write the line "element face N" with the number of faces before it, or export the surface again.'
				);
			}
			element.properties.push({ name, type: types[isList ? 1 : 0], list: isList ? types[0] : null });
		} else if (text !== '' && !(encoding && elements.length === 0)) {
			// Some exporters forget the word "comment"; before the first element a strange line can mean nothing else.
			throw bad('expected a header line (format, element, property, comment, end_header)');
		}
	}
	if (!encoding) throw syntax('The PLY header has no "format" line.', { line, byte: 0 });
	if (!elements.some((e) => e.name === 'vertex')) {
		throw unsupported('The PLY file declares no vertices.', 'Export a surface with vertices and faces.', { line });
	}
	return { encoding, elements, comments, dataAt: Math.min(at, bytes.length), dataLine: line + 1 };
}
