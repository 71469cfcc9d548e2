import { FLOAT32_DIGITS, assemble, digitsLost, limitsOf } from './assemble';
import { empty, lineAt, nonFinite, shown, syntaxAt, tooManyTriangles, truncated, unsupported } from './errors';
import { GrowingFloats, GrowingIndices } from './growing';
import { TextReader, latin, nameText, spellsNonFinite } from './text';
import type { Note, ReadOptions, SurfaceFile } from './types';

const BACKSLASH = 92;
const HASH = 35;
const SLASH = 47;
const CHECKPOINT_BYTES = 1 << 22;
const float = (x: number) => Math.fround(x);

/** Free-form geometry: what draws it, and what only describes it. */
const FREE_FORM = /^(curv|curv2|surf)$/;

interface Group {
	object: string;
	group: string;
	material: string;
	/** Polygon at which these words hold from. */
	first: number;
}

/**
 * Reads a Wavefront OBJ: polygons of any corner count, negative indices, line continuations, comments. Groups (g) and
 * objects (o) become patches; a file that has neither gets its materials (usemtl) as patches. Normals, texture
 * coordinates, colours, points and lines are left out and said so.
 * @param bytes the whole file, borrowed
 * @throws MorphError file-syntax, file-truncated, file-non-finite, file-empty, file-unsupported, file-too-large
 */
export function readObj(bytes: Uint8Array, options: ReadOptions = {}): SurfaceFile {
	const limits = limitsOf(options);
	const reader = new TextReader(bytes, bytes[0] === 0xef && bytes[1] === 0xbb && bytes[2] === 0xbf ? 3 : 0);
	const positions = new GrowingFloats(bytes.length / 30);
	const offsets = new GrowingIndices(bytes.length / 60);
	const corners = new GrowingIndices(bytes.length / 20);
	/** Where a face names a vertex that had not come yet; checked at the end. */
	let ahead = -1;
	let highest = -1;
	const groups: Group[] = [{ object: '', group: '', material: '', first: 0 }];
	const dropped = new Map<string, number>();
	const drop = (word: string) => dropped.set(word, (dropped.get(word) ?? 0) + 1);
	const notes: Note[] = [];
	let weights = 0;
	let colours = 0;
	let lost = 0;
	let nextCheckpoint = CHECKPOINT_BYTES;
	offsets.push(0);

	/** Moves to the next token of the statement, over continued lines; false at its end. */
	const more = (): boolean => {
		for (;;) {
			reader.skipBlanks();
			if (reader.atLineEnd()) return false;
			const byte = bytes[reader.at];
			if (byte === HASH) return false;
			if (byte !== BACKSLASH) return true;
			const after = bytes[reader.at + 1];
			if (after !== 10 && after !== 13 && reader.at + 1 < bytes.length) return true;
			reader.skipLine();
		}
	};
	const word = () => {
		const from = reader.at;
		let i = from;
		while (i < bytes.length && bytes[i] > 32) i++;
		return latin(bytes, from, Math.min(i, from + 60));
	};
	const vertexCount = () => positions.length / 3;

	const readVertex = () => {
		const begin = reader.at;
		let count = 0;
		let weight = 1;
		reader.mostDigits = 0;
		while (more()) {
			const at = reader.at;
			const value = reader.numberHere();
			if (count < 3) {
				// Something glued to the number, as in 1.0,2.0 or 1x.
				const whole = reader.atTokenEnd() || bytes[reader.at] === BACKSLASH;
				if (!Number.isFinite(float(value)) || !whole) {
					reader.at = at;
					const text = word();
					if (whole && (spellsNonFinite(text) || Math.abs(value) > 1e38)) {
						throw nonFinite(
							`Line ${lineAt(bytes, at)}: coordinate "${shown(text)}" of vertex ${vertexCount() | 0} is not a finite 32-bit number.`,
							{ line: lineAt(bytes, at), byte: at, vertex: vertexCount() | 0 }
						);
					}
					throw syntaxAt(bytes, at, `expected a coordinate, found "${shown(text)}".`);
				}
				if (reader.mostDigits > FLOAT32_DIGITS) lost = Math.max(lost, Math.abs(value - float(value)));
				positions.push(float(value) + 0);
			} else if (count === 3) weight = value;
			count++;
			if (!reader.atTokenEnd()) {
				reader.at = reader.at + 1;
				while (!reader.atTokenEnd()) reader.at++;
			}
		}
		if (count < 3) {
			if (reader.at >= bytes.length)
				throw truncated('The file ends inside a vertex.', { byte: bytes.length, line: lineAt(bytes, begin) });
			throw syntaxAt(bytes, begin, `a vertex of ${count} coordinates; 3 are needed.`);
		}
		if (count >= 6) colours++;
		else if (count === 4 && weight !== 1) weights++;
	};

	const readFace = () => {
		const begin = reader.at;
		const first = corners.length;
		while (more()) {
			const at = reader.at;
			const index = reader.integerHere();
			const ending = reader.at < bytes.length ? bytes[reader.at] : 32;
			if (Number.isNaN(index) || !(ending <= 32 || ending === SLASH || ending === BACKSLASH)) {
				reader.at = at;
				throw syntaxAt(bytes, at, `expected a vertex number, found "${shown(word())}".`);
			}
			const known = vertexCount();
			const vertex = index > 0 ? index - 1 : known + index;
			if (index === 0 || vertex < 0 || vertex > 0xfffffffe) {
				throw syntaxAt(bytes, at, `a face names vertex ${index}, but ${known} vertices come before it.`);
			}
			if (vertex > highest) {
				highest = vertex;
				if (vertex >= known) ahead = at;
			}
			corners.push(vertex);
			if (ending === SLASH) {
				// The numbers of texture coordinate and normal.
				let i = reader.at;
				while (i < bytes.length && (bytes[i] === SLASH || bytes[i] === 45 || (bytes[i] >= 48 && bytes[i] <= 57))) i++;
				reader.at = i;
				if (!reader.atTokenEnd() && bytes[i] !== BACKSLASH) {
					reader.at = at;
					throw syntaxAt(bytes, at, `expected vertex/texture/normal numbers, found "${shown(word())}".`);
				}
			}
		}
		const n = corners.length - first;
		if (n < 3) {
			if (reader.at >= bytes.length)
				throw truncated('The file ends inside a face.', { byte: bytes.length, line: lineAt(bytes, begin) });
			throw syntaxAt(bytes, begin, `a face of ${n} corners; at least 3 are needed.`);
		}
		offsets.push(corners.length);
		const triangles = corners.length - 2 * (offsets.length - 1);
		if (triangles > limits.maxTriangles) throw tooManyTriangles(triangles, limits, begin);
	};

	const name = (): string => {
		let text = '';
		while (more()) {
			const from = reader.at;
			while (!reader.atLineEnd() && bytes[reader.at] !== BACKSLASH) reader.at++;
			if (bytes[reader.at] === BACKSLASH && !/[\r\n]/.test(String.fromCharCode(bytes[reader.at + 1] ?? 10)))
				reader.at++;
			text += nameText(bytes.subarray(from, reader.at)) + ' ';
		}
		return text.trim().replace(/\s+/g, ' ');
	};
	const group = (change: Partial<Group>) => {
		const last = groups[groups.length - 1];
		const next = { ...last, ...change, first: offsets.length - 1 };
		if (last.first === next.first) groups[groups.length - 1] = next;
		else groups.push(next);
	};

	while (reader.at < bytes.length) {
		reader.skipWhite();
		if (reader.at >= bytes.length) break;
		if (options.checkpoint && reader.at > nextCheckpoint) {
			options.checkpoint((0.8 * reader.at) / bytes.length);
			nextCheckpoint = reader.at + CHECKPOINT_BYTES;
		}
		const at = reader.at;
		const a = bytes[at];
		const b = at + 1 < bytes.length ? bytes[at + 1] : 10;
		if (a === 118 && b <= 32) {
			reader.at++;
			readVertex();
		} else if (a === 102 && (b <= 32 || (b === 111 && (bytes[at + 2] ?? 32) <= 32))) {
			reader.at += b === 111 ? 2 : 1;
			readFace();
		} else if (a === HASH) reader.skipLine();
		else {
			reader.token();
			const statement = reader.text();
			if (statement === 'g') group({ group: name() });
			else if (statement === 'o') group({ object: name() });
			else if (statement === 'usemtl') group({ material: name() });
			else if (!/^[a-z_]\w*$/i.test(statement)) {
				throw syntaxAt(bytes, at, `expected an OBJ statement (v, f, g, o, ...), found "${shown(statement)}".`);
			} else {
				if (statement !== 'mtllib' && statement !== 's') drop(statement);
				while (more()) reader.token();
			}
		}
		// A comment behind the statement.
		reader.skipBlanks();
		if (bytes[reader.at] === HASH) reader.skipLine();
	}

	const known = vertexCount();
	if (highest >= known) {
		throw syntaxAt(bytes, ahead, `a face names vertex ${highest + 1}, but the file has only ${known}.`);
	}
	const drawn = [...dropped].filter(([statement]) => FREE_FORM.test(statement));
	if (offsets.length === 1) {
		if (drawn.length > 0) {
			throw unsupported(
				`The file describes free-form geometry (${drawn.map(([s]) => s).join(', ')}) and no faces.`,
				'Export the surface as a mesh of faces.'
			);
		}
		if (known === 0) throw empty('The file holds no vertices and no faces.');
	}
	if (dropped.size > 0) {
		const list = [...dropped].slice(0, 12).map(([statement, n]) => `${statement} (${n})`);
		const rest = dropped.size > 12 ? ` and ${dropped.size - 12} others` : '';
		notes.push({
			code: 'dropped',
			text: `Statements that are no part of the surface were left out: ${list.join(', ')}${rest}.`
		});
	}
	if (colours > 0) notes.push({ code: 'dropped', text: `The colours of ${colours} vertices were left out.` });
	if (weights > 0) notes.push({ code: 'dropped', text: `The weights of ${weights} vertices were left out.` });
	if (lost > 0) notes.push(digitsLost(lost));
	return assemble(
		{
			format: 'obj',
			encoding: 'ascii',
			positions: positions.take(),
			offsets: offsets.take(),
			corners: corners.take(),
			runs: patchNames(groups),
			arrays: [],
			notes
		},
		options
	);
}

/** Groups and objects name the patches, both where both are used; materials only where there are neither. */
function patchNames(groups: Group[]): { name: string; first: number }[] {
	const objects = groups.some((g) => g.object !== '');
	const named = groups.some((g) => g.group !== '');
	return groups.map((g) => {
		let name: string;
		if (objects && named)
			name = g.object === g.group || !g.group ? g.object : g.object ? `${g.object}/${g.group}` : g.group;
		else if (objects || named) name = g.object || g.group;
		else name = g.material;
		return { name, first: g.first };
	});
}
