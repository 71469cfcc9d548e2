import { MorphError, type MapTable, type WithCheckpoint } from '$lib/morph';
import { toUtf8 } from './detect';
import { lineAt, shown } from './errors';
import { planTable, isComment, splitFields, fieldNumber, type TableColumns, type TablePlan } from './table-plan';
import { TextReader, nameText, plainBytes, spellsNonFinite } from './text';

export interface ReadTableOptions extends WithCheckpoint {
	/** As the dialog left it; default: what planTable finds. */
	plan?: TablePlan;
	/** Which columns hold what; default: the plan's guess. */
	columns?: TableColumns;
	/** Most rows; default 50 million. */
	maxRows?: number;
}

const CHECKPOINT_ROWS = 1 << 17;
const MAX_ROWS = 50_000_000;

function chosenColumns(plan: TablePlan, columns: TableColumns | undefined): number[] {
	const chosen = columns ?? plan.guess;
	const list = chosen ? [chosen.x, chosen.y, chosen.z, ...chosen.value] : [];
	if (
		!chosen ||
		(list.length !== 4 && list.length !== 6) ||
		list.some((k) => !Number.isInteger(k) || k < 0 || !plan.columns[k])
	) {
		const names = plan.columns.map((c) => `"${shown(c.name)}"`);
		throw new MorphError(
			'map-shape',
			`Which of the ${names.length} columns (${names.slice(0, 12).join(', ')}) hold x, y, z and the sensitivity cannot be told.`,
			'Choose the columns of x, y, z and of the sensitivity (one, or three for a vector).',
			{ line: 1 }
		);
	}
	return list;
}

/**
 * Reads a table of points with sensitivities from text of any delimiter, with decimal point or comma; lines that begin
 * with #, // or % and empty lines are skipped.
 * @param bytes the whole file, borrowed; UTF-16 with its mark is converted
 * @returns the table in the engine's form, and the plan by which it was read
 * @throws MorphError csv-empty, csv-syntax, csv-non-finite, map-shape (columns cannot be told)
 */
export function readMapTable(
	bytes: Uint8Array,
	filename: string,
	options: ReadTableOptions = {}
): { table: MapTable; plan: TablePlan } {
	const text = toUtf8(plainBytes(bytes)).bytes;
	const plan = options.plan ?? planTable(text, filename);
	const columns = chosenColumns(plan, options.columns);
	const reader = new RowReader(text, plan, columns, options);
	return { table: reader.read(filename), plan };
}

/** Rows of plain numbers are read in one pass without splitting; all else (quotes, words, decimal comma) by its fields. */
class RowReader {
	private readonly components: 1 | 3;
	private readonly delimiter: number;
	/** What stands in each column: 0 to 2 coordinate, 3 to 5 value, -1 nothing wanted. */
	private readonly roles: Int8Array;
	private readonly row = new Float64Array(6);
	private readonly fields: number[] = [];
	private readonly reader: TextReader;
	private rows = 0;

	constructor(
		private readonly bytes: Uint8Array,
		private readonly plan: TablePlan,
		private readonly columns: number[],
		private readonly options: ReadTableOptions
	) {
		this.components = (columns.length - 3) as 1 | 3;
		this.delimiter = plan.delimiter.charCodeAt(0);
		this.roles = new Int8Array(plan.columns.length).fill(-1);
		// A column may serve twice only through the slow way.
		columns.forEach((column, role) => (this.roles[column] = role));
		this.reader = new TextReader(bytes);
	}

	/** One row from `from`; where it ends, or -1 when the fields have to be split. */
	private quick(from: number): number {
		const { bytes, delimiter, roles, row, reader } = this;
		const n = bytes.length;
		const last = roles.length - 1;
		let i = from;
		for (let c = 0; c <= last; c++) {
			while (i < n && (bytes[i] === 32 || (bytes[i] === 9 && delimiter !== 9))) i++;
			if (roles[c] < 0) {
				while (i < n && bytes[i] !== delimiter && bytes[i] > 32) i++;
				if (bytes[i] === 34) return -1;
			} else {
				reader.at = i;
				const value = reader.numberHere();
				i = reader.at;
				if (!(value - value === 0)) return -1;
				row[roles[c]] = value;
			}
			if (c < last) {
				if (delimiter === 32) {
					if (bytes[i] !== 32 && bytes[i] !== 9) return -1;
				} else {
					while (i < n && bytes[i] === 32) i++;
					if (bytes[i] !== delimiter) return -1;
				}
				i++;
			}
		}
		while (i < n && (bytes[i] === 32 || bytes[i] === 9)) i++;
		if (i < n && bytes[i] !== 10 && bytes[i] !== 13) return -1;
		return i;
	}

	private fault(code: 'csv-syntax' | 'csv-non-finite', byte: number, message: string, mend: string): MorphError {
		const line = lineAt(this.bytes, byte);
		return new MorphError(code, `Line ${line}${message}`, mend, { line, row: this.rows + 1, byte });
	}

	private slow(from: number): number {
		const { bytes, plan, columns, fields, row } = this;
		let to = from;
		while (to < bytes.length && bytes[to] !== 10 && bytes[to] !== 13) to++;
		splitFields(bytes, from, to, this.delimiter, fields);
		const count = fields.length / 2;
		if (count !== plan.columns.length) {
			throw this.fault(
				'csv-syntax',
				from,
				`: ${count} columns where ${plan.columns.length} are expected.`,
				'Complete or remove that line.'
			);
		}
		for (let role = 0; role < columns.length; role++) {
			const [a, b] = [fields[2 * columns[role]], fields[2 * columns[role] + 1]];
			const value = fieldNumber(bytes, a, b, plan.decimal);
			if (Number.isFinite(value)) {
				row[role] = value;
				continue;
			}
			const word = nameText(bytes.subarray(a, b));
			const notFinite = !Number.isNaN(value) || spellsNonFinite(word);
			throw this.fault(
				notFinite ? 'csv-non-finite' : 'csv-syntax',
				a,
				`, column ${columns[role] + 1}: "${shown(word)}" is ${notFinite ? 'not a finite number' : 'no number'}.`,
				notFinite
					? 'Remove that row, or repair it where the map was made.'
					: 'Correct that field, or choose another delimiter, decimal sign or column.'
			);
		}
		return to;
	}

	read(filename: string): MapTable {
		const { bytes, plan, components, row, options } = this;
		const n = bytes.length;
		const quickly = plan.decimal === '.' && new Set(this.columns).size === this.columns.length;
		const maxRows = options.maxRows ?? MAX_ROWS;
		let capacity = Math.max(16, Math.ceil(n / 40));
		let points = new Float64Array(3 * capacity);
		let values = new Float64Array(components * capacity);
		let lines = new Uint32Array(capacity);
		let at = bytes[0] === 0xef && bytes[1] === 0xbb && bytes[2] === 0xbf ? 3 : 0;
		let line = 0;
		let skip = plan.skipLines;
		while (at < n) {
			line++;
			let first = at;
			while (first < n && (bytes[first] === 32 || bytes[first] === 9)) first++;
			let to: number;
			if (first >= n || bytes[first] === 10 || bytes[first] === 13 || isComment(bytes, first, n) || skip > 0) {
				const isText = first < n && bytes[first] !== 10 && bytes[first] !== 13 && !isComment(bytes, first, n);
				if (isText) skip--;
				to = first;
				while (to < n && bytes[to] !== 10 && bytes[to] !== 13) to++;
			} else {
				to = quickly ? this.quick(at) : -1;
				if (to < 0) to = this.slow(at);
				if (this.rows === capacity) {
					capacity *= 2;
					points = grown(points, 3 * capacity);
					values = grown(values, components * capacity);
					const more = new Uint32Array(capacity);
					more.set(lines);
					lines = more;
				}
				const p = 3 * this.rows;
				points[p] = row[0];
				points[p + 1] = row[1];
				points[p + 2] = row[2];
				if (components === 1) values[this.rows] = row[3];
				else {
					values[p] = row[3];
					values[p + 1] = row[4];
					values[p + 2] = row[5];
				}
				lines[this.rows++] = line;
				if (this.rows > maxRows) {
					throw new MorphError(
						'file-too-large',
						`"${shown(filename)}" holds more than ${maxRows} rows.`,
						'Thin the map out, or give it on the surface itself (VTP, VTK or PLY).',
						{ line, row: this.rows }
					);
				}
				if (options.checkpoint && this.rows % CHECKPOINT_ROWS === 0) options.checkpoint(at / n);
			}
			at = to + (bytes[to] === 13 && bytes[to + 1] === 10 ? 2 : 1);
		}
		const { rows } = this;
		if (rows === 0) {
			throw new MorphError('csv-empty', `"${shown(filename)}" holds no row of numbers.`, 'Give at least one row.', {
				line
			});
		}
		options.checkpoint?.(1);
		return {
			points: points.slice(0, 3 * rows),
			values: values.slice(0, components * rows),
			components,
			rows,
			lines: lines.slice(0, rows),
			header: plan.header === 'none' ? null : plan.columns.map((c) => c.name)
		};
	}
}

function grown(array: Float64Array, length: number): Float64Array<ArrayBuffer> {
	const out = new Float64Array(length);
	out.set(array);
	return out;
}
