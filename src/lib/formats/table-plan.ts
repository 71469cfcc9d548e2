import { MorphError } from '$lib/morph';
import { shown } from './errors';
import { TextReader, nameText, plainBytes, spellsNonFinite } from './text';

export type Delimiter = ',' | ';' | '\t' | '|' | ' ';

export interface TableColumn {
	/** The header's name, or "column 3". */
	name: string;
	/** The field of the first row, as it stands. */
	sample: string;
	/** Whether all the rows that were looked at hold a number here. */
	numeric: boolean;
}

/** Which columns hold what, from 0; value: one column (density, nodal) or three (vector). */
export interface TableColumns {
	x: number;
	y: number;
	z: number;
	value: [number] | [number, number, number];
}

/** How a table is read: found by planTable, shown in a dialog, changed there, given back to readMapTable. */
export interface TablePlan {
	/** ' ' stands for any run of blanks and tabs. */
	delimiter: Delimiter;
	decimal: '.' | ',';
	/** Where the names come from: the first line, a comment before the first row, or nowhere. */
	header: 'line' | 'comment' | 'none';
	/** Lines at the beginning that hold no row (names, units); comments and empty lines are not counted. */
	skipLines: number;
	columns: TableColumn[];
	/** null where x, y, z or the value cannot be told. */
	guess: TableColumns | null;
	/** Whether the guess follows from names, or only from the order of the columns. */
	byName: boolean;
	/** Fields of the first rows, for the preview. */
	rows: string[][];
}

/** Bytes from which the plan is made. */
const SAMPLE_BYTES = 1 << 18;
const SAMPLE_LINES = 200;
const PREVIEW_ROWS = 12;
const MAX_SKIPPED = 20;
const MAX_COLUMNS = 1000;
const DELIMITERS: Delimiter[] = ['\t', ';', ',', '|', ' '];
const MEND =
	'Give rows of x, y, z and the sensitivity (or its three components), separated by comma, semicolon, tab or space.';

export const isComment = (bytes: Uint8Array, at: number, end: number) =>
	bytes[at] === 35 || bytes[at] === 37 || (bytes[at] === 47 && at + 1 < end && bytes[at + 1] === 47);

/** Fields of a line: [start, end, start, end, ...] without blanks around and without quotes; quoted ones may hold the delimiter. */
export function splitFields(bytes: Uint8Array, from: number, to: number, delimiter: number, out: number[]): void {
	out.length = 0;
	const blank = (byte: number) => byte === 32 || (byte === 9 && delimiter !== 9);
	let i = from;
	for (;;) {
		while (i < to && blank(bytes[i])) i++;
		if (delimiter === 32 && i >= to) return;
		let start = i;
		let end: number;
		if (i < to && bytes[i] === 34) {
			start = ++i;
			while (i < to && !(bytes[i] === 34 && bytes[i + 1] !== 34)) i += bytes[i] === 34 ? 2 : 1;
			end = Math.min(i, to);
			i++;
			while (i < to && bytes[i] !== delimiter && !(delimiter === 32 && blank(bytes[i]))) i++;
		} else {
			while (i < to && bytes[i] !== delimiter && !(delimiter === 32 && bytes[i] === 9)) i++;
			end = i;
			while (end > start && blank(bytes[end - 1])) end--;
		}
		out.push(start, end);
		if (i >= to) return;
		i++;
		// A delimiter at the very end closes the last field and opens none.
		if (i >= to) return;
	}
}

/** The number of a field, or NaN; a decimal comma is read from a copy. */
export function fieldNumber(bytes: Uint8Array, from: number, to: number, decimal: '.' | ','): number {
	if (from >= to) return NaN;
	let field = bytes;
	let at = from;
	let end = to;
	if (decimal === ',') {
		field = bytes.slice(from, to);
		at = 0;
		end = to - from;
		for (let i = 0; i < end; i++) {
			if (field[i] === 46) return NaN;
			if (field[i] === 44) field[i] = 46;
		}
	}
	const reader = new TextReader(field, at, end);
	const value = reader.numberHere();
	return reader.at === end ? value : NaN;
}

interface Line {
	from: number;
	to: number;
}

function linesOf(bytes: Uint8Array, at: number, end: number): { lines: Line[]; comments: Map<number, Line> } {
	const lines: Line[] = [];
	/** The last comment before line k. */
	const comments = new Map<number, Line>();
	while (at < end && lines.length < SAMPLE_LINES) {
		let to = at;
		while (to < end && bytes[to] !== 10 && bytes[to] !== 13) to++;
		// A line that the sample cuts off is not looked at.
		if (to >= end && end < bytes.length && lines.length > 0) break;
		let from = at;
		while (from < to && (bytes[from] === 32 || bytes[from] === 9)) from++;
		if (from < to) {
			if (isComment(bytes, from, to)) comments.set(lines.length, { from, to });
			// A tab at the beginning is an empty first field.
			else lines.push({ from: at, to });
		}
		at = to + (bytes[to] === 13 && bytes[to + 1] === 10 ? 2 : 1);
	}
	return { lines, comments };
}

interface Split {
	delimiter: Delimiter;
	decimal: '.' | ',';
	fields: number[][];
	/** First line all of whose fields that are numbers later are numbers. */
	first: number;
	columns: number;
	share: number;
}

function trySplit(bytes: Uint8Array, lines: Line[], delimiter: Delimiter, decimal: '.' | ','): Split | null {
	const code = delimiter.charCodeAt(0);
	const fields = lines.map(({ from, to }) => {
		const out: number[] = [];
		splitFields(bytes, from, to, code, out);
		return out;
	});
	// The usual column count is that of the last lines: the first ones may be titles.
	const counts = new Map<number, number>();
	for (const f of fields) counts.set(f.length / 2, (counts.get(f.length / 2) ?? 0) + 1);
	const columns = [...counts].sort((a, b) => b[1] - a[1] || b[0] - a[0])[0][0];
	if (columns < 2 || columns > MAX_COLUMNS) return null;
	const numbers = (f: number[]) => {
		let n = 0;
		for (let k = 0; k < f.length; k += 2) {
			const text = nameText(bytes.subarray(f[k], Math.min(f[k + 1], f[k] + 8)));
			if (!Number.isNaN(fieldNumber(bytes, f[k], f[k + 1], decimal)) || spellsNonFinite(text)) n++;
		}
		return n;
	};
	const found = fields.map(numbers);
	const usual = Math.max(...found.map((n, i) => (fields[i].length / 2 === columns ? n : 0)));
	if (usual < 2) return null;
	let first = 0;
	while (first < lines.length && !(fields[first].length / 2 === columns && found[first] >= Math.max(2, usual / 2)))
		first++;
	if (first > MAX_SKIPPED) return null;
	let good = 0;
	for (let i = first; i < lines.length; i++) if (fields[i].length / 2 === columns) good += found[i] / columns;
	return { delimiter, decimal, fields, first, columns, share: good / (lines.length - first) };
}

const bare = (name: string) =>
	name
		.toLowerCase()
		.replace(/\([^)]*\)|\[[^\]]*\]/g, '')
		.replace(/[^a-z0-9]+/g, '_')
		.replace(/^_+|_+$/g, '');

const COORDINATE = (axis: string, number: number) =>
	new RegExp(
		`^(${axis}|${axis}_?coord(inate)?s?|coord(inate)?s?_?${axis}|pos(ition)?_?${axis}|points?_?${axis}|points?_?${number}|coord(inate)?s?_?${number}|c(ent(er|re|roid))?_?${axis})$`
	);
const VALUE =
	/^(sensitivity|value|density|derivative|gradient|sens|dj_dn|djdn|surface_sensitivity|normal_sensitivity|sensitivity_normal|map)$/;

/** Columns by their names, else by the usual order. */
export function guessColumns(columns: TableColumn[], named: boolean): { guess: TableColumns | null; byName: boolean } {
	const names = columns.map((c) => bare(c.name));
	const numeric = columns.map((c, k) => (c.numeric ? k : -1)).filter((k) => k >= 0);
	const xyz = named
		? ['x', 'y', 'z'].map((axis, i) => names.findIndex((n) => COORDINATE(axis, i).test(n)))
		: [-1, -1, -1];
	if (xyz.every((k) => k >= 0)) {
		const [x, y, z] = xyz;
		const rest = numeric.filter((k) => !xyz.includes(k));
		// Three that end in x, y, z (or 0, 1, 2) with the same stem.
		for (const k of rest) {
			for (const ends of [
				['x', 'y', 'z'],
				['0', '1', '2']
			]) {
				if (!names[k].endsWith(ends[0])) continue;
				const stem = names[k].slice(0, -1);
				const three = ends.map((end) => rest.find((j) => names[j] === stem + end) ?? -1);
				if (/^(n|normals?_?)$/.test(stem)) continue;
				if (three.every((j) => j >= 0))
					return { guess: { x, y, z, value: three as [number, number, number] }, byName: true };
			}
		}
		const value = rest.find((k) => VALUE.test(names[k])) ?? (rest.length === 1 ? rest[0] : -1);
		if (value >= 0) return { guess: { x, y, z, value: [value] }, byName: true };
		return { guess: null, byName: false };
	}
	if (numeric.length === 4)
		return { guess: { x: numeric[0], y: numeric[1], z: numeric[2], value: [numeric[3]] }, byName: false };
	if (numeric.length === 6) {
		const [x, y, z, a, b, c] = numeric;
		return { guess: { x, y, z, value: [a, b, c] }, byName: false };
	}
	return { guess: null, byName: false };
}

/**
 * Finds how a table of text is to be read, from its first lines: delimiter, decimal sign, header, columns.
 * @param file the file or at least its first 256 kB, borrowed; UTF-8 or Latin-1 (see toUtf8 for UTF-16)
 * @throws MorphError csv-empty, csv-syntax
 */
export function planTable(file: Uint8Array, filename: string): TablePlan {
	const bytes = plainBytes(file);
	const begin = bytes[0] === 0xef && bytes[1] === 0xbb && bytes[2] === 0xbf ? 3 : 0;
	const end = Math.min(bytes.length, SAMPLE_BYTES);
	const zero = bytes.subarray(0, end).indexOf(0);
	if (zero >= 0)
		throw new MorphError('csv-syntax', `"${shown(filename)}" is no text: byte ${zero} is zero.`, MEND, { byte: zero });
	const { lines, comments } = linesOf(bytes, begin, end);
	if (lines.length === 0)
		throw new MorphError('csv-empty', `"${shown(filename)}" holds no row of numbers.`, MEND, { line: 1 });
	let best: Split | null = null;
	for (const delimiter of DELIMITERS) {
		for (const decimal of ['.', ','] as const) {
			if (decimal === ',' && delimiter === ',') continue;
			const split = trySplit(bytes, lines, delimiter, decimal);
			// Clearly better only: what comes first in the list is the likelier of equals.
			if (split && (!best || split.share > best.share + 0.02)) best = split;
		}
	}
	if (!best) {
		const text = nameText(bytes.subarray(lines[0].from, Math.min(lines[0].to, lines[0].from + 60)));
		throw new MorphError('csv-syntax', `Line 1: "${shown(text)}" and what follows are no table of numbers.`, MEND, {
			line: 1,
			row: 1
		});
	}
	const { first, fields, decimal, delimiter, columns: count } = best;
	const text = (f: number[], k: number) => nameText(bytes.subarray(f[2 * k], f[2 * k + 1])).replaceAll('""', '"');
	let header: TablePlan['header'] = 'none';
	let names: string[] = [];
	const titles = fields.slice(0, first).find((f) => f.length / 2 === count);
	const comment = comments.get(first);
	if (titles) {
		header = 'line';
		names = Array.from({ length: count }, (_, k) => text(titles, k));
	} else if (comment) {
		let from = comment.from;
		while (from < comment.to && [35, 37, 47, 32, 9].includes(bytes[from])) from++;
		for (const code of [delimiter.charCodeAt(0), 44, 32]) {
			const f: number[] = [];
			splitFields(bytes, from, comment.to, code, f);
			if (f.length / 2 !== count) continue;
			header = 'comment';
			names = Array.from({ length: count }, (_, k) => text(f, k));
			break;
		}
	}
	const rows = fields.slice(first).filter((f) => f.length / 2 === count);
	if (rows.length === 0)
		throw new MorphError('csv-empty', `"${shown(filename)}" holds no row of numbers.`, MEND, { line: 1 });
	const columns = Array.from({ length: count }, (_, k) => ({
		name: names[k] || `column ${k + 1}`,
		sample: text(rows[0], k),
		numeric: rows.every(
			(f) => !Number.isNaN(fieldNumber(bytes, f[2 * k], f[2 * k + 1], decimal)) || spellsNonFinite(text(f, k))
		)
	}));
	return {
		delimiter,
		decimal,
		header,
		skipLines: first,
		columns,
		...guessColumns(columns, header !== 'none'),
		rows: rows.slice(0, PREVIEW_ROWS).map((f) => Array.from({ length: count }, (_, k) => text(f, k)))
	};
}
