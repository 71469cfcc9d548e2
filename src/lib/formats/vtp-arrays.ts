import { FLOAT32_DIGITS } from './assemble';
import { Base64Source, RawSource, type ByteSource } from './byte-source';
import { lineAt, shown, syntax, truncated, unsupported } from './errors';
import { InflateError, inflateExactly } from './inflate-node';
import { SCALAR_BYTES, decodeScalars, readScalar, type NumberArray, type ScalarType } from './scalars';
import { TextReader, spellsNonFinite } from './text';
import type { FileEncoding } from './types';
import type { XmlNode } from './xml';

export const XML_TYPES: Record<string, ScalarType> = {
	Int8: 'int8',
	UInt8: 'uint8',
	Int16: 'int16',
	UInt16: 'uint16',
	Int32: 'int32',
	UInt32: 'uint32',
	Int64: 'int64',
	UInt64: 'uint64',
	Float32: 'float32',
	Float64: 'float64'
};

/** No deflate stream holds more than 1032 bytes for each of its own (its format allows 258 for 2 bits). */
const MOST_GAIN = 1040;

export interface XmlFile {
	bytes: Uint8Array;
	little: boolean;
	/** Type of the byte counts. */
	header: 'uint32' | 'uint64';
	compressed: boolean;
	/** First byte behind the "_" of the appended data, or -1. */
	appendedAt: number;
	appendedEnd: number;
	appendedRaw: boolean;
	maxBytes: number;
}

export interface XmlNumbers {
	values: NumberArray;
	encoding: FileEncoding;
	/** ASCII: the most that a value lost in 32 bits among those of more than nine digits. */
	worst: number;
}

const nameOf = (node: XmlNode) => shown(node.attributes.Name ?? node.attributes.type ?? 'without a name');

/**
 * The numbers of a DataArray in any of its formats.
 * @param count how many there must be, or null when only the array itself tells
 */
export function readXmlNumbers(file: XmlFile, node: XmlNode, count: number | null): XmlNumbers {
	const { bytes } = file;
	const type = XML_TYPES[node.attributes.type ?? ''];
	const place = { byte: node.byte, line: lineAt(bytes, node.byte) };
	const what = `the array "${nameOf(node)}"`;
	if (!type)
		throw syntax(`Line ${place.line}: ${what} has the unknown type "${shown(node.attributes.type ?? '')}".`, place);
	const format = (node.attributes.format ?? 'ascii').toLowerCase();
	if (format === 'ascii') return readAscii(file, node, type, count, what);
	let source: ByteSource;
	let raw = false;
	if (format === 'appended') {
		const offset = Number(node.attributes.offset ?? NaN);
		if (file.appendedAt < 0)
			throw syntax(`Line ${place.line}: ${what} stands in appended data, which the file lacks.`, place);
		if (!Number.isInteger(offset) || offset < 0 || file.appendedAt + offset > file.appendedEnd) {
			throw syntax(
				`Line ${place.line}: ${what} has the offset "${shown(node.attributes.offset ?? '')}", outside of the data.`,
				place
			);
		}
		raw = file.appendedRaw;
		const from = file.appendedAt + offset;
		source = raw ? new RawSource(bytes, from) : new Base64Source(bytes, from, file.appendedEnd);
	} else if (format === 'binary') source = new Base64Source(bytes, node.textFrom, node.textTo);
	else throw syntax(`Line ${place.line}: ${what} has the unknown format "${shown(format)}".`, place);

	const size = SCALAR_BYTES[type];
	const data = file.compressed ? readBlocks(file, source, what, place) : readCounted(file, source, what, place);
	if (source instanceof Base64Source && source.fault >= 0) {
		const byte = source.fault;
		const line = lineAt(bytes, byte);
		throw syntax(
			`Line ${line}: ${what} has the character "${shown(String.fromCharCode(bytes[byte]))}" in its base64 text.`,
			{
				byte,
				line
			}
		);
	}
	const wanted = count ?? Math.floor(data.length / size);
	if (data.length !== wanted * size) {
		throw syntax(`Line ${place.line}: ${what} holds ${data.length} bytes; ${wanted * size} are needed.`, place);
	}
	const encoding = `${raw ? 'raw' : 'base64'}${file.compressed ? '-zlib' : ''}` as FileEncoding;
	return { values: decodeScalars(data, 0, wanted, type, file.little), encoding, worst: 0 };
}

type Place = { byte: number; line: number };

function readWord(file: XmlFile, source: ByteSource, what: string, place: Place): number {
	const size = SCALAR_BYTES[file.header];
	const word = source.read(size);
	if (word.length < size)
		throw truncated(`The data of ${what} (line ${place.line}) end before their byte count.`, place);
	return readScalar(new DataView(word.buffer, word.byteOffset, size), 0, file.header, file.little);
}

function readCounted(file: XmlFile, source: ByteSource, what: string, place: Place): Uint8Array {
	const size = readWord(file, source, what, place);
	const data = size <= source.left ? source.read(size) : null;
	if (data?.length === size) return data;
	throw truncated(`The data of ${what} (line ${place.line}) should be ${size} bytes, but the file ends before.`, place);
}

/** [blocks][size of a block][size of the last one, 0 when it is full][compressed sizes], then the blocks. */
function readBlocks(file: XmlFile, source: ByteSource, what: string, place: Place): Uint8Array {
	const word = SCALAR_BYTES[file.header];
	const blocks = readWord(file, source, what, place);
	if (blocks === 0) return new Uint8Array(0);
	if ((blocks + 2) * word > source.left) {
		throw truncated(
			`The data of ${what} (line ${place.line}) should be ${blocks} blocks, but the file ends before.`,
			place
		);
	}
	const full = readWord(file, source, what, place);
	const last = readWord(file, source, what, place) || full;
	const sizes = new Float64Array(blocks);
	for (let k = 0; k < blocks; k++) sizes[k] = readWord(file, source, what, place);
	const total = (blocks - 1) * full + last;
	if (last > full || total > file.maxBytes || total > MOST_GAIN * source.left) {
		throw syntax(
			`Line ${place.line}: ${what} announces ${total} bytes in ${blocks} blocks, which its data cannot hold.`,
			place
		);
	}
	const out = new Uint8Array(total);
	for (let k = 0; k < blocks; k++) {
		const packed = sizes[k] <= source.left ? source.read(sizes[k]) : null;
		if (packed?.length !== sizes[k]) {
			throw truncated(`The data of ${what} (line ${place.line}) end in block ${k} of ${blocks}.`, place);
		}
		try {
			out.set(inflateExactly(packed, k === blocks - 1 ? last : full), k * full);
		} catch (thrown) {
			if (!(thrown instanceof InflateError)) throw thrown;
			throw syntax(`Line ${place.line}: block ${k} of ${what} cannot be unpacked: its zlib data are damaged.`, place);
		}
	}
	return out;
}

function readAscii(file: XmlFile, node: XmlNode, type: ScalarType, count: number | null, what: string): XmlNumbers {
	const { bytes } = file;
	const reader = new TextReader(bytes, node.textFrom, node.textTo);
	const length = node.textTo - node.textFrom;
	const fault = (text: string) => {
		const line = lineAt(bytes, reader.start);
		return syntax(`Line ${line}: ${text}`, { byte: Math.min(reader.start, bytes.length), line });
	};
	if (count !== null && 2 * count - 1 > length) {
		reader.start = node.byte;
		throw fault(`${what} needs ${count} numbers, but only ${length} characters stand there.`);
	}
	let values = type === 'float32' ? new Float32Array(count ?? 0) : new Float64Array(count ?? Math.ceil(length / 2));
	let worst = 0;
	let filled = 0;
	for (;;) {
		reader.skipWhite();
		if (reader.at >= node.textTo) break;
		if (count !== null && filled === count) {
			reader.start = reader.at;
			throw fault(`${what} holds more than the ${count} numbers that are needed.`);
		}
		if (filled === values.length) {
			const grown = new Float64Array(2 * filled + 16);
			grown.set(values);
			values = grown;
		}
		reader.mostDigits = 0;
		const value = reader.numberHere();
		if (Number.isNaN(value) || !reader.atTokenEnd()) {
			while (!reader.atTokenEnd()) reader.at++;
			if (!(Number.isNaN(value) && spellsNonFinite(reader.text()))) {
				throw fault(`expected a number of ${what}, found "${shown(reader.text())}".`);
			}
		}
		if (reader.mostDigits > FLOAT32_DIGITS) worst = Math.max(worst, Math.abs(value - Math.fround(value)));
		values[filled++] = value;
	}
	if (count !== null && filled < count) {
		reader.start = node.byte;
		throw fault(`${what} holds ${filled} numbers; ${count} are needed.`);
	}
	return { values: filled === values.length ? values : values.slice(0, filled), encoding: 'ascii', worst };
}

/** Refuses what the file needs and is not here, by its name. */
export function compressorOf(name: string | undefined): boolean {
	if (!name) return false;
	if (name === 'vtkZLibDataCompressor') return true;
	throw unsupported(
		`The file is packed with ${shown(name.replace(/^vtk|DataCompressor$/g, ''))}, which is not read here.`,
		'Save it with zlib or without compression.'
	);
}
