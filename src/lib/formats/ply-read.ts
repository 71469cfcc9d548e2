import { FLOAT32_DIGITS, assemble, digitsLost, limitsOf, patchArray, runsOfCells } from './assemble';
import { empty, lineAt, nonFinite, shown, syntax, tooManyTriangles, truncated, unsupported } from './errors';
import { GrowingIndices } from './growing';
import { LIST_OF_CORNERS, readPlyHeader, type PlyElement, type PlyHeader, type PlyProperty } from './ply-header';
import { SCALAR_BYTES, isFloat, readScalar, type ScalarType } from './scalars';
import { TextReader, spellsNonFinite } from './text';
import type { NamedArray, Note, ReadOptions, SurfaceFile } from './types';

const AXES = ['x', 'y', 'z'];
/** Vertex data that is no map: normals, colours, texture coordinates. */
const NO_MAP =
	/^(n[xyz]|normal_?[xyz]|(diffuse_|ambient_|specular_)?(red|green|blue|alpha)|[rgba]|s|t|u|v|texture_[uv])$/;
const CHECKPOINT_ITEMS = 1 << 17;
const MAX_CORNERS = 1 << 24;

/** The data behind the header, one number at a time. */
class Source {
	at: number;
	private readonly view: DataView;
	readonly text: TextReader | null;
	private readonly little: boolean;

	constructor(
		readonly bytes: Uint8Array,
		header: PlyHeader
	) {
		this.at = header.dataAt;
		this.view = new DataView(bytes.buffer, bytes.byteOffset, bytes.byteLength);
		this.text = header.encoding === 'ascii' ? new TextReader(bytes, header.dataAt) : null;
		this.little = header.encoding === 'binary-little-endian';
	}

	place(): { byte: number; line?: number } {
		if (!this.text) return { byte: this.at };
		return { byte: this.text.start, line: lineAt(this.bytes, this.text.start) };
	}

	/** The next number; NaN and infinities as they are. */
	read(type: ScalarType, element: PlyElement, index: number): number {
		if (this.text) {
			const value = this.text.number();
			if (Number.isNaN(value) || !this.text.atTokenEnd()) this.refuseWord(value, element, index);
			return value;
		}
		const at = this.at;
		const end = at + SCALAR_BYTES[type];
		if (end > this.bytes.length) throw this.cutOff(element, index);
		this.at = end;
		return readScalar(this.view, at, type, this.little);
	}

	private refuseWord(value: number, element: PlyElement, index: number): void {
		const text = this.text!;
		if (text.start >= this.bytes.length) throw this.cutOff(element, index);
		while (!text.atTokenEnd()) text.at++;
		const word = text.text();
		if (spellsNonFinite(word) && Number.isNaN(value)) return;
		const place = this.place();
		throw syntax(`Line ${place.line}: expected a number of ${element.name} ${index}, found "${shown(word)}".`, place);
	}

	cutOff(element: PlyElement, index: number) {
		return truncated(
			`The header announces ${element.count} of "${element.name}", but the file ends after ${this.bytes.length} bytes, in number ${index}.`,
			{ byte: this.bytes.length }
		);
	}

	get remaining(): number {
		return this.bytes.length - (this.text ? this.text.at : this.at);
	}
}

/** Least bytes that one item takes: what refuses a count that the file cannot hold before memory is taken. */
function leastBytes(element: PlyElement, ascii: boolean): number {
	return element.properties.reduce((sum, p) => sum + (ascii ? 2 : SCALAR_BYTES[p.list ?? p.type]), 0);
}

/**
 * Reads a PLY: ASCII, little and big endian; elements, properties and lists in any order; faces of any corner count and
 * triangle strips. Other scalar properties become point and cell arrays; properties named ..x, ..y, ..z are one array.
 * @param bytes the whole file, borrowed
 * @throws MorphError file-syntax, file-truncated, file-non-finite, file-empty, file-unsupported, file-too-large
 */
export function readPly(bytes: Uint8Array, options: ReadOptions = {}): SurfaceFile {
	const limits = limitsOf(options);
	const header = readPlyHeader(bytes);
	const source = new Source(bytes, header);
	const vertexElement = header.elements.find((e) => e.name === 'vertex')!;
	const faces = header.elements.find((e) => e.name === 'face' && e.count > 0);
	const tells = (e: PlyElement) => e.count > 0 && /^(face|tristrips)$/.test(e.name);
	if (!header.elements.some(tells) && options.points !== 'accept') {
		throw empty(
			`The PLY file holds ${vertexElement.count} points but no faces: it is a cloud of points, not a surface.`,
			'Give a surface with faces: reconstruct one from the points, or choose it in the export.'
		);
	}
	if (faces && faces.count > limits.maxTriangles) throw tooManyTriangles(faces.count, limits, faces.byte);
	const notes: Note[] = [];
	const arrays: NamedArray[] = [];
	let positions: Float32Array | null = null;
	const offsets = new GrowingIndices(faces ? Math.min(faces.count + 1, bytes.length) : 16);
	const corners = new GrowingIndices(faces ? Math.min(3 * faces.count, bytes.length) : 16);
	offsets.push(0);

	for (const element of header.elements) {
		const least = leastBytes(element, source.text !== null);
		// The last number of an ASCII file needs no blank behind it.
		if (element.count > 0 && element.count * least > source.remaining + 1) throw source.cutOff(element, 0);
		if (element.count > 0 && least === 0) continue;
		if (element.name === 'vertex') positions = readVertices(source, element, options, arrays, notes);
		else if (element.name === 'face') {
			readFaces(source, element, offsets, corners, arrays, options);
		} else if (element.name === 'tristrips') readStrips(source, element, offsets, corners, notes);
		else {
			skip(source, element);
			if (element.count > 0) {
				notes.push({ code: 'dropped', text: `${element.count} items of the element "${element.name}" were left out.` });
			}
		}
		const triangles = corners.length - 2 * (offsets.length - 1);
		if (triangles > limits.maxTriangles) throw tooManyTriangles(triangles, limits, element.byte);
	}
	if (!positions) throw empty('The PLY file holds no vertices.');
	checkCorners(corners, offsets, positions.length / 3, source, faces);
	if (source.text) source.text.skipWhite();
	if (source.remaining > 0) {
		notes.push({ code: 'tail', text: `${source.remaining} bytes behind the last element were left out.` });
	}
	const patches = patchArray(arrays, options.patchArray);
	return assemble(
		{
			format: 'ply',
			encoding: header.encoding,
			positions,
			offsets: offsets.take(),
			corners: corners.take(),
			runs: patches ? runsOfCells(patches.values, patches.name, patchNames(header.comments)) : [],
			arrays,
			notes
		},
		options
	);
}

/** Our own writer keeps the names in comments: `patch NUMBER NAME`. */
function patchNames(comments: string[]): Map<number, string> {
	const names = new Map<number, string>();
	for (const comment of comments) {
		const match = /^patch (\d+) ?(.*)$/.exec(comment);
		if (match) names.set(Number(match[1]), match[2]);
	}
	return names;
}

/** Scalar properties as arrays; three in a row named alike up to x, y, z become one. Returns where each value goes. */
function planArrays(
	properties: PlyProperty[],
	on: NamedArray['on'],
	count: number,
	arrays: NamedArray[]
): ({ values: Float64Array; stride: number; offset: number } | null)[] {
	const sinks: ({ values: Float64Array; stride: number; offset: number } | null)[] = properties.map(() => null);
	for (let k = 0; k < properties.length; k++) {
		const { name, list } = properties[k];
		if (list || sinks[k] || NO_MAP.test(name) || (on === 'point' && AXES.includes(name))) continue;
		const stem = /^(.*?)[_:. ]?x$/i.exec(name)?.[1];
		const isVector =
			stem &&
			k + 2 < properties.length &&
			['y', 'z'].every((axis, j) => {
				const next = properties[k + 1 + j];
				return !next.list && next.name.toLowerCase() === name.slice(0, -1).toLowerCase() + axis;
			});
		const components = isVector ? 3 : 1;
		const values = new Float64Array(components * count);
		arrays.push({ name: isVector ? stem : name, on, components, values });
		for (let j = 0; j < components; j++) sinks[k + j] = { values, stride: components, offset: j };
	}
	return sinks;
}

function readVertices(
	source: Source,
	element: PlyElement,
	options: ReadOptions,
	arrays: NamedArray[],
	notes: Note[]
): Float32Array {
	const { count, properties } = element;
	const axes = AXES.map((axis) => properties.findIndex((p) => p.name === axis && !p.list));
	if (axes.includes(-1)) {
		throw unsupported(
			'The vertices of the PLY file have no properties x, y and z.',
			'Export the surface with the coordinates of its vertices.',
			{ line: element.line, byte: element.byte }
		);
	}
	const positions = new Float32Array(3 * count);
	const sinks = planArrays(properties, 'point', count, arrays);
	const exact = source.text ? true : axes.some((k) => properties[k].type === 'float64' || !isFloat(properties[k].type));
	const axisOf = properties.map((_, k) => axes.indexOf(k));
	const left = properties.filter((p, k) => !p.list && axisOf[k] < 0 && !sinks[k] && !/^n[xyz]$/.test(p.name));
	let worst = 0;
	for (let v = 0; v < count; v++) {
		for (let k = 0; k < properties.length; k++) {
			const property = properties[k];
			if (property.list) {
				skipList(source, property, element, v);
				continue;
			}
			if (source.text) source.text.mostDigits = 0;
			const value = source.read(property.type, element, v);
			const axis = axisOf[k];
			if (axis >= 0) {
				const single = Math.fround(value);
				if (!Number.isFinite(single)) {
					throw nonFinite(`Coordinate ${AXES[axis]} of vertex ${v} is not a finite 32-bit number.`, {
						...source.place(),
						vertex: v
					});
				}
				positions[3 * v + axis] = single + 0;
				if (exact && (!source.text || source.text.mostDigits > FLOAT32_DIGITS)) {
					worst = Math.max(worst, Math.abs(value - single));
				}
			} else {
				const sink = sinks[k];
				if (sink) sink.values[sink.stride * v + sink.offset] = value;
			}
		}
		if (options.checkpoint && v % CHECKPOINT_ITEMS === 0) options.checkpoint((0.4 * v) / count);
	}
	if (worst > 0) notes.push(digitsLost(worst));
	if (left.length > 0 && count > 0) {
		notes.push({
			code: 'dropped',
			text: `Properties of the vertices were left out: ${left.map((p) => shown(p.name)).join(', ')}.`
		});
	}
	return positions;
}

function listLength(source: Source, property: PlyProperty, element: PlyElement, index: number): number {
	const n = source.read(property.list!, element, index);
	if (!Number.isInteger(n) || n < 0 || n > MAX_CORNERS) {
		throw syntax(`The list "${shown(property.name)}" of ${element.name} ${index} has the length ${n}.`, source.place());
	}
	if (n * (source.text ? 2 : SCALAR_BYTES[property.type]) > source.remaining + 1) throw source.cutOff(element, index);
	return n;
}

function skipList(source: Source, property: PlyProperty, element: PlyElement, index: number): void {
	const n = listLength(source, property, element, index);
	if (source.text) for (let i = 0; i < n; i++) source.read(property.type, element, index);
	else source.at += n * SCALAR_BYTES[property.type];
}

function skip(source: Source, element: PlyElement): void {
	for (let i = 0; i < element.count; i++) {
		for (const property of element.properties) {
			if (property.list) skipList(source, property, element, i);
			else source.read(property.type, element, i);
		}
	}
}

function cornerList(element: PlyElement): number {
	const lists = element.properties.map((p, k) => ({ p, k })).filter(({ p }) => p.list);
	const found = lists.find(({ p }) => LIST_OF_CORNERS.test(p.name)) ?? (lists.length === 1 ? lists[0] : undefined);
	if (found) return found.k;
	throw unsupported(
		`The faces of the PLY file have no list "vertex_indices".`,
		'Export the surface with the corners of its faces.',
		{ line: element.line, byte: element.byte }
	);
}

function readFaces(
	source: Source,
	element: PlyElement,
	offsets: GrowingIndices,
	corners: GrowingIndices,
	arrays: NamedArray[],
	options: ReadOptions
): void {
	if (element.count === 0) return;
	const { properties, count } = element;
	const list = cornerList(element);
	const sinks = planArrays(properties, 'cell', count, arrays);
	const { type } = properties[list];
	for (let f = 0; f < count; f++) {
		for (let k = 0; k < properties.length; k++) {
			if (k === list) {
				const n = listLength(source, properties[k], element, f);
				if (n < 3) {
					throw syntax(`Face ${f} has ${n} corners; at least 3 are needed.`, { ...source.place(), triangle: f });
				}
				for (let i = 0; i < n; i++) {
					const vertex = source.read(type, element, f);
					if (!(vertex >= 0 && vertex <= 0xfffffffe) || !Number.isInteger(vertex)) {
						throw syntax(`Face ${f} names vertex ${vertex}, which does not exist.`, { ...source.place(), triangle: f });
					}
					corners.push(vertex);
				}
				offsets.push(corners.length);
			} else if (properties[k].list) skipList(source, properties[k], element, f);
			else {
				const value = source.read(properties[k].type, element, f);
				const sink = sinks[k];
				if (sink) sink.values[sink.stride * f + sink.offset] = value;
			}
		}
		if (options.checkpoint && f % CHECKPOINT_ITEMS === 0) options.checkpoint(0.4 + (0.4 * f) / count);
	}
}

/** Triangle strips, ended by -1, as scan archives write them: every second triangle is turned. */
function readStrips(
	source: Source,
	element: PlyElement,
	offsets: GrowingIndices,
	corners: GrowingIndices,
	notes: Note[]
): void {
	if (element.count === 0) return;
	const list = cornerList(element);
	let made = 0;
	for (let e = 0; e < element.count; e++) {
		for (let k = 0; k < element.properties.length; k++) {
			const property = element.properties[k];
			if (k !== list) {
				if (property.list) skipList(source, property, element, e);
				else source.read(property.type, element, e);
				continue;
			}
			const n = listLength(source, property, element, e);
			let a = 0;
			let b = 0;
			let run = 0;
			for (let i = 0; i < n; i++) {
				const vertex = source.read(property.type, element, e);
				if (vertex === -1) {
					run = 0;
					continue;
				}
				if (!(vertex >= 0 && vertex <= 0xfffffffe) || !Number.isInteger(vertex)) {
					throw syntax(`Triangle strip ${e} names vertex ${vertex}, which does not exist.`, source.place());
				}
				if (run >= 2) {
					corners.push(run % 2 === 0 ? a : b);
					corners.push(run % 2 === 0 ? b : a);
					corners.push(vertex);
					offsets.push(corners.length);
					made++;
				}
				a = b;
				b = vertex;
				run++;
			}
		}
	}
	notes.push({ code: 'strips', text: `Triangle strips were read as ${made} triangles.` });
}

function checkCorners(
	corners: GrowingIndices,
	offsets: GrowingIndices,
	vertexCount: number,
	source: Source,
	faces: PlyElement | undefined
): void {
	const { data, length } = corners;
	for (let i = 0; i < length; i++) {
		if (data[i] < vertexCount) continue;
		let face = 0;
		while (offsets.data[face + 1] <= i) face++;
		throw syntax(
			`Face ${face} names vertex ${data[i]}, but the file has only ${vertexCount} vertices (0 to ${vertexCount - 1}).`,
			{ triangle: face, vertex: data[i], byte: faces?.byte ?? source.at },
			'Export the surface again: its faces and vertices do not fit together.'
		);
	}
}
