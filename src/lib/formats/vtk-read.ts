import { FLOAT32_DIGITS } from './assemble';
import { empty, lineAt, shown, syntax, truncated, unsupported } from './errors';
import { cellCount, surfaceOf, type CellBlock, type PolyData } from './polydata';
import { SCALAR_BYTES, decodeScalars, type NumberArray, type ScalarType } from './scalars';
import { TextReader, nameText, spellsNonFinite } from './text';
import type { NamedArray, ReadOptions, SurfaceFile } from './types';

type VtkType = ScalarType | 'bit' | 'string';

const TYPES: Record<string, VtkType> = {
	bit: 'bit',
	string: 'string',
	utf8_string: 'string',
	char: 'int8',
	signed_char: 'int8',
	unsigned_char: 'uint8',
	short: 'int16',
	unsigned_short: 'uint16',
	int: 'int32',
	unsigned_int: 'uint32',
	long: 'int64',
	unsigned_long: 'uint64',
	vtktypeint64: 'int64',
	vtktypeuint64: 'uint64',
	// Written as int, whatever the program holds.
	vtkidtype: 'int32',
	float: 'float32',
	double: 'float64'
};

const MAX_TITLE = 4096;
/** Components of the attributes that name none. */
const FIXED_COMPONENTS: Record<string, number> = { vectors: 3, normals: 3, tensors: 9, tensors6: 6 };

/** Reads a legacy file after Kitware's "VTK File Formats": one object per file, keywords in any case. */
class LegacyReader {
	readonly reader: TextReader;
	private binary = false;
	private version = 0;
	private on: NamedArray['on'] | null = null;
	private tuples = 0;
	private readonly data: PolyData;
	private readonly blocks: Record<string, CellBlock | null> = {};
	private points = false;

	constructor(
		readonly bytes: Uint8Array,
		private readonly options: ReadOptions
	) {
		this.reader = new TextReader(bytes);
		this.data = {
			format: 'vtk',
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

	private place(byte: number) {
		return { byte, line: lineAt(this.bytes, byte) };
	}

	private wrong(expected: string) {
		const found = this.reader.start < this.bytes.length ? `found "${shown(this.reader.text())}"` : 'the file ends';
		const place = this.place(this.reader.start);
		if (this.reader.start >= this.bytes.length) return this.cutOff(expected);
		return syntax(`Line ${place.line}: expected ${expected}, ${found}.`, place);
	}

	private cutOff(what: string) {
		return truncated(`The file ends where ${what} is expected.`, { byte: this.bytes.length });
	}

	private word(what: string): string {
		if (!this.reader.token()) throw this.cutOff(what);
		return this.reader.text();
	}

	private count(what: string): number {
		const text = this.word(what);
		if (!/^\d{1,15}$/.test(text)) throw this.wrong(what);
		return Number(text);
	}

	private type(): VtkType {
		const type = TYPES[this.word('a data type').toLowerCase()];
		if (!type) throw this.wrong('a data type (float, double, int, ...)');
		return type;
	}

	read(): SurfaceFile {
		this.readHead();
		const { reader } = this;
		while (reader.token()) {
			const at = reader.start;
			if (reader.is('points')) this.readPoints();
			else if (reader.is('vertices') || reader.is('lines') || reader.is('polygons') || reader.is('triangle_strips')) {
				this.readCells(reader.text().toLowerCase());
			} else if (reader.is('point_data')) this.enter('point');
			else if (reader.is('cell_data')) this.enter('cell');
			else if (reader.is('metadata')) this.skipMetadata();
			else if (reader.is('field')) this.readField();
			else if (this.on) this.readAttribute(reader.text().toLowerCase());
			else throw this.wrong('a keyword (POINTS, POLYGONS, POINT_DATA, ...)');
			if (reader.at <= at) throw this.wrong('another keyword');
			this.options.checkpoint?.((0.8 * reader.at) / this.bytes.length);
		}
		if (!this.points) throw empty('The VTK file holds no POINTS.');
		const { blocks, data } = this;
		data.vertexCells = cellCount(blocks.vertices);
		data.lineCells = cellCount(blocks.lines);
		data.polys = blocks.polygons ?? null;
		data.strips = blocks.triangle_strips ?? null;
		const cells = data.vertexCells + data.lineCells + cellCount(data.polys) + cellCount(data.strips);
		for (const array of data.arrays) {
			const wanted = array.on === 'cell' ? cells : data.points.length / 3;
			const tuples = array.values.length / array.components;
			if (tuples !== wanted) {
				throw syntax(
					`The ${array.on} array "${shown(array.name)}" has ${tuples} values for ${wanted} ${array.on}s.`,
					{ byte: data.pointsByte },
					'Export the surface again: its arrays and its cells do not fit together.'
				);
			}
		}
		return surfaceOf(data, this.options);
	}

	private readHead(): void {
		const { reader } = this;
		const first = nameText(reader.restOfLine().subarray(0, 80));
		const version = /^#\s*vtk\s+DataFile\s+Version\s+(\d+)(\.\d+)?/i.exec(first);
		if (!version) throw syntax('Line 1: expected "# vtk DataFile Version ...".', { line: 1, byte: 0 });
		this.version = Number(version[1]);
		const title = reader.at;
		reader.skipLine();
		if (reader.at - title > MAX_TITLE) throw syntax('Line 2: the title is too long.', { line: 2, byte: title });
		const encoding = this.word('ASCII or BINARY');
		if (!reader.is('ascii') && !reader.is('binary')) throw this.wrong('ASCII or BINARY');
		this.binary = encoding.toLowerCase() === 'binary';
		this.data.encoding = this.binary ? 'binary-big-endian' : 'ascii';
		this.word('DATASET');
		if (!reader.is('dataset')) throw this.wrong('DATASET');
		const kind = this.word('POLYDATA');
		if (reader.is('polydata')) return;
		if (!/^(structured_points|structured_grid|unstructured_grid|rectilinear_grid|field)$/i.test(kind)) {
			throw this.wrong('POLYDATA');
		}
		throw unsupported(
			`The VTK file holds a ${kind.toUpperCase()}, not a surface.`,
			'Extract the surface first and save it as PolyData.',
			this.place(reader.start)
		);
	}

	/** Binary data begin directly behind the line of their keyword. */
	private toData(): void {
		if (this.binary) this.reader.skipLine();
	}

	private numbers(count: number, type: VtkType, what: string): { values: NumberArray; worst: number } {
		const { reader, bytes } = this;
		this.toData();
		const left = bytes.length - reader.at;
		const size = type === 'bit' ? 1 / 8 : SCALAR_BYTES[type as ScalarType];
		const need = this.binary ? Math.ceil(count * size) : 2 * count - 1;
		if (need > left) {
			throw truncated(
				`${what} needs ${count} numbers (${this.binary ? need : `at least ${need}`} bytes), but only ${left} bytes follow.`,
				{ byte: bytes.length }
			);
		}
		if (this.binary) {
			const from = reader.at;
			reader.at += need;
			if (type === 'bit') {
				const values = new Uint8Array(count);
				for (let i = 0; i < count; i++) values[i] = (bytes[from + (i >> 3)] >> (7 - (i & 7))) & 1;
				return { values, worst: 0 };
			}
			return { values: decodeScalars(bytes, from, count, type as ScalarType, false), worst: 0 };
		}
		const values = type === 'float32' ? new Float32Array(count) : new Float64Array(count);
		let worst = 0;
		for (let i = 0; i < count; i++) {
			reader.mostDigits = 0;
			const value = reader.number();
			if (Number.isNaN(value) || !reader.atTokenEnd()) {
				if (reader.start >= bytes.length) throw this.cutOff(`number ${i} of ${what}`);
				while (!reader.atTokenEnd()) reader.at++;
				if (!(Number.isNaN(value) && spellsNonFinite(reader.text()))) throw this.wrong(`number ${i} of ${what}`);
			}
			values[i] = value;
			if (reader.mostDigits > FLOAT32_DIGITS) worst = Math.max(worst, Math.abs(value - Math.fround(value)));
		}
		return { values, worst };
	}

	private readPoints(): void {
		const at = this.reader.start;
		if (this.points) throw syntax('The VTK file has POINTS twice.', this.place(at));
		const count = this.count('the number of points');
		const type = this.type();
		if (type === 'string') throw this.wrong('a data type of numbers');
		const { values, worst } = this.numbers(3 * count, type, 'POINTS');
		this.points = true;
		this.data.pointsExact = this.binary || worst > 0;
		this.data.points = values;
		this.data.pointsByte = at;
	}

	private readCells(keyword: string): void {
		const at = this.reader.start;
		if (this.blocks[keyword]) throw syntax(`The VTK file has ${keyword.toUpperCase()} twice.`, this.place(at));
		const first = this.count(`the number of ${keyword}`);
		const size = this.count(`the size of ${keyword}`);
		if (this.version >= 5) {
			const offsets = this.named('offsets', first, keyword);
			const connectivity = this.named('connectivity', size, keyword);
			this.blocks[keyword] = { offsets, connectivity, byte: at };
			return;
		}
		const { values } = this.numbers(size, 'int32', keyword.toUpperCase());
		if (first > size)
			throw syntax(`${keyword.toUpperCase()}: ${first} cells do not fit in ${size} numbers.`, this.place(at));
		const offsets = new Float64Array(first + 1);
		const connectivity = new Float64Array(size - first);
		let i = 0;
		let filled = 0;
		for (let c = 0; c < first; c++) {
			const n = values[i++];
			if (!(n >= 0) || i + n > size) {
				throw syntax(
					`${keyword.toUpperCase()}: cell ${c} has ${n} points, which do not fit in the ${size} numbers given.`,
					{
						...this.place(at),
						triangle: c
					}
				);
			}
			for (let k = 0; k < n; k++) connectivity[filled++] = values[i++];
			offsets[c + 1] = filled;
		}
		if (i !== size) {
			throw syntax(
				`${keyword.toUpperCase()}: ${first} cells take ${i} numbers, but ${size} are given.`,
				this.place(at)
			);
		}
		this.blocks[keyword] = { offsets, connectivity, byte: at };
	}

	/** OFFSETS or CONNECTIVITY of version 5. */
	private named(keyword: string, count: number, of: string): NumberArray {
		this.word(keyword.toUpperCase());
		if (!this.reader.is(keyword)) throw this.wrong(`${keyword.toUpperCase()} of ${of.toUpperCase()}`);
		const type = this.type();
		if (type === 'string' || type === 'bit') throw this.wrong('a type of whole numbers');
		return this.numbers(count, type, `${keyword.toUpperCase()} of ${of.toUpperCase()}`).values;
	}

	private enter(on: NamedArray['on']): void {
		this.tuples = this.count(`the number of ${on}s`);
		this.on = on;
	}

	/** METADATA runs to the next empty line. */
	private skipMetadata(): void {
		const { reader } = this;
		reader.skipLine();
		while (reader.at < this.bytes.length) {
			if (nameText(reader.restOfLine().subarray(0, 80)) === '') return;
		}
	}

	private keep(name: string, components: number, values: NumberArray): void {
		if (!this.on) return;
		this.data.arrays.push({ name: decoded(name), on: this.on, components, values: Float64Array.from(values) });
	}

	private components(what: string): number {
		const n = this.count(what);
		if (n < 1 || n > 1000) throw this.wrong(`${what} (1 to 1000)`);
		return n;
	}

	private readField(): void {
		const outside = this.on === null;
		this.word('the name of the field');
		const arrays = this.count('the number of arrays');
		for (let k = 0; k < arrays; k++) {
			let name = this.word('the name of an array');
			while (this.reader.is('metadata')) {
				this.skipMetadata();
				name = this.word('the name of an array');
			}
			const components = this.count('the number of components');
			const tuples = this.count('the number of tuples');
			const type = this.type();
			if (type === 'string') {
				this.skipStrings(components * tuples);
				continue;
			}
			const { values } = this.numbers(components * tuples, type, `array "${shown(name)}"`);
			if (!outside && components > 0) this.keep(name, components, values);
		}
	}

	/** Strings: a line each, or in binary each behind its length, whose two highest bits tell the bytes of the length. */
	private skipStrings(count: number): void {
		const { reader, bytes } = this;
		reader.skipLine();
		for (let i = 0; i < count; i++) {
			if (reader.at >= bytes.length) throw this.cutOff(`string ${i} of ${count}`);
			if (!this.binary) {
				reader.skipLine();
				continue;
			}
			const size = 8 >> (bytes[reader.at] >> 6);
			let length = bytes[reader.at] & 63;
			for (let k = 1; k < size; k++) length = length * 256 + (bytes[reader.at + k] ?? 0);
			reader.at += size + length;
			if (reader.at > bytes.length) throw this.cutOff(`string ${i} of ${count}`);
		}
	}

	private readAttribute(keyword: string): void {
		const name = this.word('the name of the array');
		if (keyword === 'scalars') {
			const type = this.type();
			if (type === 'string') throw this.wrong('a data type of numbers');
			let components = 1;
			this.reader.skipBlanks();
			if (!this.reader.atLineEnd()) components = this.components('the number of components');
			const before = this.reader.at;
			this.word('LOOKUP_TABLE');
			if (this.reader.is('lookup_table')) this.word('the name of the lookup table');
			// Old files leave the line out.
			else this.reader.at = before;
			this.keep(name, components, this.numbers(components * this.tuples, type, `scalars "${shown(name)}"`).values);
		} else if (FIXED_COMPONENTS[keyword] !== undefined) {
			const type = this.type();
			if (type === 'string') throw this.wrong('a data type of numbers');
			const components = FIXED_COMPONENTS[keyword];
			const { values } = this.numbers(components * this.tuples, type, `${keyword} "${shown(name)}"`);
			if (keyword !== 'normals') this.keep(name, components, values);
		} else if (keyword === 'texture_coordinates') {
			const components = this.components('the dimension');
			const type = this.type();
			if (type === 'string') throw this.wrong('a data type of numbers');
			this.numbers(components * this.tuples, type, 'TEXTURE_COORDINATES');
		} else if (keyword === 'lookup_table') {
			const size = this.count('the size of the lookup table');
			this.numbers(4 * size, this.binary ? 'uint8' : 'float32', 'LOOKUP_TABLE');
		} else if (keyword === 'color_scalars') {
			const components = this.components('the number of components');
			this.numbers(components * this.tuples, this.binary ? 'uint8' : 'float32', 'COLOR_SCALARS');
		} else if (keyword === 'global_ids' || keyword === 'pedigree_ids' || keyword === 'edge_flags') {
			const type = this.type();
			if (type === 'string') this.skipStrings(this.tuples);
			else this.numbers(this.tuples, type, keyword.toUpperCase());
		} else {
			throw syntax(
				`Line ${lineAt(this.bytes, this.reader.start)}: expected a data array (SCALARS, VECTORS, FIELD, ...), found "${shown(keyword)}".`,
				this.place(this.reader.start)
			);
		}
	}
}

/** Names are percent-encoded since version 4. */
function decoded(name: string): string {
	try {
		return decodeURIComponent(name);
	} catch {
		return name;
	}
}

/**
 * Reads a legacy VTK PolyData file, ASCII or binary, versions 2 to 5.1: polygons, triangle strips, point and cell arrays.
 * @param bytes the whole file, borrowed
 * @throws MorphError file-syntax, file-truncated, file-non-finite, file-empty, file-unsupported, file-too-large
 */
export const readVtk = (bytes: Uint8Array, options: ReadOptions = {}): SurfaceFile =>
	new LegacyReader(bytes, options).read();
