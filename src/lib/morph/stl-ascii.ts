import { MorphError } from './errors';
import { parseNumber } from './number-text';
import type { Mesh, Patch, WithCheckpoint } from './types';
import { Welder } from './weld';

const NEWLINE = 10;
const RETURN = 13;
const CHECKPOINT_TRIANGLES = 1 << 14;
/** Splits a text into tokens without making strings for numbers; counts lines for the messages. */
class Scanner {
	at = 0;
	line = 1;
	/** Bounds of the current token. */
	start = 0;
	end = 0;
	tokenLine = 1;

	constructor(readonly bytes: Uint8Array) {
		if (bytes[0] === 0xef && bytes[1] === 0xbb && bytes[2] === 0xbf) this.at = 3;
	}

	/** Moves to the next token; false at the end of the file. */
	next(): boolean {
		const { bytes } = this;
		const n = bytes.length;
		let i = this.at;
		while (i < n && bytes[i] <= 32) {
			if (bytes[i] === NEWLINE) this.line++;
			// Old files end lines with a lone carriage return.
			else if (bytes[i] === RETURN && bytes[i + 1] !== NEWLINE) this.line++;
			i++;
		}
		this.start = i;
		this.tokenLine = this.line;
		while (i < n && bytes[i] > 32) i++;
		this.end = i;
		this.at = i;
		return this.start < this.end;
	}

	/** Whether the token is this lower-case word, in any case. */
	is(word: string): boolean {
		if (this.end - this.start !== word.length) return false;
		for (let k = 0; k < word.length; k++) if ((this.bytes[this.start + k] | 32) !== word.charCodeAt(k)) return false;
		return true;
	}

	text(): string {
		return new TextDecoder().decode(this.bytes.subarray(this.start, this.end));
	}

	/** The rest of the current line, without its end. */
	restOfLine(): string {
		const from = this.at;
		let i = from;
		while (i < this.bytes.length && this.bytes[i] !== NEWLINE && this.bytes[i] !== RETURN) i++;
		this.at = i;
		return new TextDecoder().decode(this.bytes.subarray(from, i));
	}

	/** The token as a number; NaN when it is none. */
	number(): number {
		return parseNumber(this.bytes, this.start, this.end);
	}
}

const shown = (text: string) => (text.length > 40 ? `${text.slice(0, 40)}...` : text);

/** ASCII STL, in any case and spacing; every solid becomes a patch. See readStl. */
export function parseAsciiStl(bytes: Uint8Array, options: WithCheckpoint): Mesh {
	const scan = new Scanner(bytes);
	const patches: Patch[] = [];
	// A facet takes about 250 bytes as usually written; the arrays grow when that is wrong.
	let triangles = new Uint32Array(3 * Math.max(16, Math.ceil(bytes.length / 200)));
	let count = 0;
	const welder = new Welder(bytes.length / 500);
	const float = new Float32Array(1);
	const bits = new Uint32Array(float.buffer);
	const corner = new Uint32Array(3);
	let facetLine = 0;

	const cutOff = (inside: string) =>
		new MorphError(
			'stl-truncated',
			`The file ends inside ${inside} (line ${scan.line}).`,
			'The file was cut off: export or upload it again.',
			{ line: scan.line, byte: bytes.length }
		);
	const wrong = (expected: string) =>
		new MorphError(
			'stl-syntax',
			`Line ${scan.tokenLine}: expected ${expected}, found "${shown(scan.text())}".`,
			'Export the surface again as STL with triangles only; the line shows where the text stops being STL.',
			{ line: scan.tokenLine, byte: scan.start, triangle: count }
		);
	const want = (word: string) => {
		if (!scan.next()) throw cutOff(`the facet begun in line ${facetLine}`);
		if (!scan.is(word)) throw wrong(`"${word}"`);
	};

	let open = false;
	while (scan.next()) {
		if (!open) {
			if (!scan.is('solid')) throw wrong('"solid"');
			let name = scan.restOfLine();
			// A file written on one line has its first facet behind the name.
			const facet = /(^|\s)facet\s+normal\s/i.exec(name);
			if (facet) {
				const kept = facet.index + facet[1].length;
				scan.at -= new TextEncoder().encode(name.slice(kept)).length;
				name = name.slice(0, kept);
			}
			patches.push({ name: name.trim(), firstTriangle: count, triangleCount: 0 });
			open = true;
			continue;
		}
		if (scan.is('endsolid')) {
			const rest = scan.restOfLine();
			const solid = /(^|\s)solid(\s|$)/i.exec(rest);
			const solidName = patches[patches.length - 1].name;
			// "endsolid solid" may just repeat the solid's name.
			if (solid && rest.trim() !== solidName && /facet\s/i.test(rest)) {
				scan.at -= new TextEncoder().encode(rest.slice(solid.index)).length;
			}
			open = false;
			continue;
		}
		if (!scan.is('facet')) throw wrong('"facet" or "endsolid"');
		facetLine = scan.tokenLine;
		// The normal is computed, not believed; whatever stands there is skipped.
		let skipped = 0;
		do {
			if (!scan.next()) throw cutOff(`the facet begun in line ${facetLine}`);
			if (++skipped > 6) throw wrong('"outer loop"');
		} while (!scan.is('outer'));
		want('loop');
		if (3 * count + 3 > triangles.length) {
			const grown = new Uint32Array(triangles.length * 2);
			grown.set(triangles);
			triangles = grown;
		}
		for (let k = 0; k < 3; k++) {
			want('vertex');
			for (let d = 0; d < 3; d++) {
				if (!scan.next()) throw cutOff(`the facet begun in line ${facetLine}`);
				const value = scan.number();
				float[0] = value;
				if (!Number.isFinite(float[0])) {
					if (Number.isNaN(value) && !/^[+-]?(nan|inf)/i.test(scan.text())) throw wrong('a number');
					throw new MorphError(
						'stl-non-finite',
						`Line ${scan.tokenLine}: coordinate "${shown(scan.text())}" of triangle ${count} is not a finite number.`,
						'Repair or remove that triangle where the surface was made, then export again.',
						{ line: scan.tokenLine, byte: scan.start, triangle: count }
					);
				}
				corner[d] = bits[0];
			}
			triangles[3 * count + k] = welder.add(corner[0], corner[1], corner[2]);
		}
		want('endloop');
		want('endfacet');
		count++;
		patches[patches.length - 1].triangleCount++;
		if (options.checkpoint && count % CHECKPOINT_TRIANGLES === 0) options.checkpoint(scan.at / bytes.length);
	}
	if (open) throw cutOff(`solid "${shown(patches[patches.length - 1].name)}", which has no "endsolid"`);
	if (count === 0) {
		throw new MorphError('stl-empty', 'The file holds no triangle.', 'Export a surface with at least one triangle.', {
			line: scan.line
		});
	}
	options.checkpoint?.(1);
	return {
		positions: welder.positions(),
		triangles: triangles.slice(0, 3 * count),
		patches,
		attributes: null,
		encoding: 'ascii'
	};
}
