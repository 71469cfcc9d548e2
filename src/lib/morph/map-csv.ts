import { MorphError } from './errors';
import { parseNumber } from './number-text';
import type { MapTable, WithCheckpoint } from './types';

const COMMA = 44;
const SEMICOLON = 59;
const HASH = 35;
const NEWLINE = 10;
const RETURN = 13;
const CHECKPOINT_ROWS = 1 << 16;
const MEND =
	'Give rows x,y,z,sensitivity or x,y,z,gx,gy,gz with a decimal point, separated by comma, semicolon, tab or space.';

const isBlank = (byte: number) => byte === 32 || byte === 9;

/** Bounds of the fields of one line: [start, end, start, end, ...]. */
function fieldsOf(bytes: Uint8Array, from: number, to: number, separator: number, out: number[]): void {
	out.length = 0;
	let i = from;
	if (separator === 0) {
		while (i < to) {
			while (i < to && isBlank(bytes[i])) i++;
			if (i >= to) return;
			const start = i;
			while (i < to && !isBlank(bytes[i])) i++;
			out.push(start, i);
		}
		return;
	}
	for (;;) {
		let end = i;
		while (end < to && bytes[end] !== separator) end++;
		let a = i;
		let b = end;
		while (a < b && isBlank(bytes[a])) a++;
		while (b > a && isBlank(bytes[b - 1])) b--;
		out.push(a, b);
		if (end >= to) return;
		i = end + 1;
	}
}

/** Column numbers of x, y, z and the one or three values, by the header's names. */
function columnsOf(names: string[], line: number): number[] {
	const lower = names.map((n) => n.toLowerCase());
	const find = (...options: string[]) => options.map((o) => lower.indexOf(o)).find((k) => k >= 0) ?? -1;
	const xyz = ['x', 'y', 'z'].map((n) => find(n));
	const vector = ['gx', 'gy', 'gz'].map((n) => find(n));
	const value = find('sensitivity', 'value', 'density', 'derivative');
	if (xyz.every((k) => k >= 0)) {
		if (vector.every((k) => k >= 0)) return [...xyz, ...vector];
		if (value >= 0) return [...xyz, value];
	}
	// Other names in the usual order are taken by their place.
	if (xyz.every((k) => k < 0) && (names.length === 4 || names.length === 6)) return names.map((_, k) => k);
	if (xyz.every((k, i) => k === i) && names.length === 4) return [0, 1, 2, 3];
	throw new MorphError(
		'csv-syntax',
		`Line ${line}: the header "${names.join(',')}" names no x, y, z with sensitivity or gx, gy, gz.`,
		MEND,
		{ line }
	);
}

/**
 * Reads a table of points with sensitivities: x,y,z,sensitivity or x,y,z,gx,gy,gz, with or without a header, separated
 * by comma, semicolon, tab or spaces; blank lines and lines that begin with # are skipped.
 * @param bytes the whole file, borrowed
 * @throws MorphError csv-empty, csv-syntax, csv-non-finite
 */
export function readMapCsv(bytes: Uint8Array, options: WithCheckpoint = {}): MapTable {
	let at = bytes[0] === 0xef && bytes[1] === 0xbb && bytes[2] === 0xbf ? 3 : 0;
	let line = 0;
	let rows = 0;
	let capacity = Math.max(16, Math.ceil(bytes.length / 40));
	let points = new Float64Array(3 * capacity);
	let values = new Float64Array(0);
	let lines = new Uint32Array(capacity);
	let columns: number[] | null = null;
	let header: string[] | null = null;
	let separator = -1;
	let fieldCount = 0;
	const fields: number[] = [];
	const text = (k: number) => new TextDecoder().decode(bytes.subarray(fields[2 * k], fields[2 * k + 1]));
	while (at < bytes.length) {
		let end = at;
		while (end < bytes.length && bytes[end] !== NEWLINE && bytes[end] !== RETURN) end++;
		const from = at;
		at = bytes[end] === RETURN && bytes[end + 1] === NEWLINE ? end + 2 : end + 1;
		line++;
		let first = from;
		while (first < end && isBlank(bytes[first])) first++;
		if (first === end || bytes[first] === HASH) continue;
		if (separator < 0) {
			const has = (byte: number) => bytes.subarray(from, end).includes(byte);
			separator = has(SEMICOLON) ? SEMICOLON : has(COMMA) ? COMMA : 0;
		}
		fieldsOf(bytes, first, end, separator, fields);
		const count = fields.length / 2;
		if (!columns) {
			fieldCount = count;
			// A row with one faulty number is no header: its other fields are numbers, or none holds a letter (decimal commas).
			const all = Array.from({ length: count }, (_, k) => k);
			const isNumber = (k: number) =>
				/^[+-]?(nan|inf(inity)?)$/i.test(text(k)) ||
				!Number.isNaN(parseNumber(bytes, fields[2 * k], fields[2 * k + 1]));
			if (!all.some(isNumber) && all.some((k) => /\p{L}/u.test(text(k)))) {
				header = all.map((k) =>
					text(k)
						.replace(/^"(.*)"$/, '$1')
						.trim()
				);
				columns = columnsOf(header, line);
				values = new Float64Array((columns.length - 3) * capacity);
				continue;
			}
			if (count !== 4 && count !== 6) {
				throw new MorphError('csv-syntax', `Line ${line}: ${count} columns; 4 or 6 are needed.`, MEND, {
					line,
					row: 1
				});
			}
			columns = Array.from({ length: count }, (_, k) => k);
			values = new Float64Array((count - 3) * capacity);
		}
		const row = rows + 1;
		if (count !== fieldCount) {
			throw new MorphError(
				'csv-syntax',
				`Line ${line}: ${count} columns where the lines before have ${fieldCount}.`,
				'Complete or remove that line.',
				{ line, row, byte: from }
			);
		}
		const components = columns.length - 3;
		if (rows === capacity) {
			capacity *= 2;
			const grownPoints = new Float64Array(3 * capacity);
			grownPoints.set(points);
			points = grownPoints;
			const grownValues = new Float64Array(components * capacity);
			grownValues.set(values);
			values = grownValues;
			const grownLines = new Uint32Array(capacity);
			grownLines.set(lines);
			lines = grownLines;
		}
		for (let k = 0; k < columns.length; k++) {
			const c = columns[k];
			const value = parseNumber(bytes, fields[2 * c], fields[2 * c + 1]);
			if (!Number.isFinite(value)) {
				const word = text(c);
				const notFinite = value === Infinity || value === -Infinity || /^[+-]?(nan|inf)/i.test(word);
				throw new MorphError(
					notFinite ? 'csv-non-finite' : 'csv-syntax',
					`Line ${line}, column ${c + 1}: "${word.slice(0, 40)}" is ${notFinite ? 'not a finite number' : 'no number'}.`,
					notFinite ? 'Remove that row, or repair it where the map was made.' : MEND,
					{ line, row, byte: fields[2 * c] }
				);
			}
			if (k < 3) points[3 * rows + k] = value;
			else values[components * rows + k - 3] = value;
		}
		lines[rows++] = line;
		if (options.checkpoint && rows % CHECKPOINT_ROWS === 0) options.checkpoint(at / bytes.length);
	}
	if (!columns || rows === 0) {
		throw new MorphError('csv-empty', 'The file holds no row of numbers.', MEND, { line });
	}
	const components = (columns.length - 3) as 1 | 3;
	options.checkpoint?.(1);
	return {
		points: points.slice(0, 3 * rows),
		values: values.slice(0, components * rows),
		components,
		rows,
		lines: lines.slice(0, rows),
		header
	};
}
