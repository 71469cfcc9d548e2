import { MorphError } from './errors';
import { parseAsciiStl } from './stl-ascii';
import { HEADER_BYTES, RECORD_BYTES, RECORD_START, decodePatchHeader } from './stl-format';
import type { Mesh, Patch, WithCheckpoint } from './types';
import { Welder } from './weld';

export type ReadStlOptions = WithCheckpoint;

const EXPONENT = 0x7f800000;
const CHECKPOINT_TRIANGLES = 1 << 16;
/** Enough of the beginning to tell words from numbers. */
const SNIFF_BYTES = 1024;

const littleEndian = new Uint8Array(new Uint16Array([1]).buffer)[0] === 1;

function beginsWithSolid(bytes: Uint8Array): boolean {
	let i = 0;
	if (bytes[0] === 0xef && bytes[1] === 0xbb && bytes[2] === 0xbf) i = 3;
	while (i < bytes.length && (bytes[i] === 32 || (bytes[i] >= 9 && bytes[i] <= 13))) i++;
	const word = 'solid';
	for (let k = 0; k < word.length; k++) if ((bytes[i + k] | 32) !== word.charCodeAt(k)) return false;
	return true;
}

/** Whether the bytes after the first line could be ASCII STL: printable, and a facet or endsolid keyword follows. */
function looksAscii(bytes: Uint8Array): boolean {
	const end = Math.min(bytes.length, SNIFF_BYTES);
	for (let i = 0; i < end; i++) if (bytes[i] === 0) return false;
	const head = new TextDecoder('latin1').decode(bytes.subarray(0, Math.min(bytes.length, 1 << 16))).toLowerCase();
	return /\bfacet\b|\bendsolid\b/.test(head);
}

/**
 * Reads an STL file and welds corners with equal coordinates.
 *
 * Binary or ASCII is decided by content: a file whose length is exactly 84 + 50 n is binary even if its header begins
 * with "solid" (as many CAD exporters write it); otherwise words decide; binary files with trailing bytes are read.
 * Triangles keep their order and degenerate ones are kept, so that a child can be written over its parent.
 *
 * @param bytes the whole file, borrowed
 * @throws MorphError stl-empty, stl-truncated, stl-not-stl, stl-syntax, stl-non-finite
 */
export function readStl(bytes: Uint8Array, options: ReadStlOptions = {}): Mesh {
	if (bytes.length === 0) {
		throw new MorphError('stl-empty', 'The file holds no bytes.', 'Export the surface again and check the upload.', {
			byte: 0
		});
	}
	const solid = beginsWithSolid(bytes);
	if (bytes.length >= RECORD_START) {
		const view = new DataView(bytes.buffer, bytes.byteOffset, bytes.byteLength);
		const count = view.getUint32(HEADER_BYTES, true);
		const size = RECORD_START + RECORD_BYTES * count;
		if (size === bytes.length && count > 0) return readBinary(bytes, view, count, options);
		if (solid && looksAscii(bytes)) return parseAsciiStl(bytes, options);
		if (count === 0) {
			throw new MorphError('stl-empty', 'The file holds no triangle.', 'Export a surface with at least one triangle.', {
				byte: HEADER_BYTES
			});
		}
		if (size < bytes.length) {
			// A wild count in a text or foreign file would pass as a short binary; real ones have only a small tail.
			if (!looksLikeBinary(view, count)) throw notStl(bytes);
			return readBinary(bytes, view, count, options);
		}
		const whole = Math.floor((bytes.length - RECORD_START) / RECORD_BYTES);
		if (solid || whole === 0 || !looksLikeBinary(view, Math.min(whole, 64)) || !plausibleCount(count, bytes.length)) {
			throw notStl(bytes);
		}
		throw new MorphError(
			'stl-truncated',
			`The header announces ${count} triangles (${size} bytes), but the file ends after ${bytes.length} bytes, in ` +
				`triangle ${whole}.`,
			'The file was cut off: export or upload it again.',
			{ byte: bytes.length, triangle: whole }
		);
	}
	if (solid) return parseAsciiStl(bytes, options);
	throw notStl(bytes);
}

function plausibleCount(count: number, size: number): boolean {
	// A truncated file still has its count in a sane range; text read as a count gives more than 500 million.
	return count < 500_000_000 || count * RECORD_BYTES < 1000 * size;
}

function looksLikeBinary(view: DataView, count: number): boolean {
	const n = Math.min(count, 64);
	let odd = 0;
	for (let t = 0; t < n; t++) {
		for (let k = 3; k < 12; k++) {
			const x = Math.abs(view.getFloat32(RECORD_START + RECORD_BYTES * t + 4 * k, true));
			if (!(x === 0 || (x > 1e-30 && x < 1e30))) odd++;
		}
	}
	return odd * 4 < n * 9;
}

function notStl(bytes: Uint8Array): MorphError {
	const text = new TextDecoder('latin1').decode(bytes.subarray(0, 40)).replace(/[^\x20-\x7e]+/g, '.');
	return new MorphError(
		'stl-not-stl',
		`The file is no STL: it begins with "${text}".`,
		'Give a binary STL (80-byte header, triangle count, 50 bytes per triangle) or an ASCII STL (solid ... endsolid).',
		{ byte: 0 }
	);
}

function readBinary(bytes: Uint8Array, view: DataView, count: number, options: ReadStlOptions): Mesh {
	const triangles = new Uint32Array(3 * count);
	const attributes = new Uint16Array(count);
	let anyAttribute = 0;
	const welder = new Welder(count / 2);
	// The bits of 12 floats lie at even offsets, so a Uint16 view reads them when the file itself is aligned.
	const aligned = littleEndian && bytes.byteOffset % 2 === 0;
	const words = aligned ? new Uint16Array(bytes.buffer, bytes.byteOffset, bytes.length >> 1) : null;
	const corner = new Uint32Array(9);
	for (let t = 0; t < count; t++) {
		const at = RECORD_START + RECORD_BYTES * t;
		if (words) {
			const w = (at >> 1) + 6;
			for (let k = 0; k < 9; k++) corner[k] = words[w + 2 * k] | (words[w + 2 * k + 1] << 16);
		} else {
			for (let k = 0; k < 9; k++) corner[k] = view.getUint32(at + 12 + 4 * k, true);
		}
		for (let k = 0; k < 9; k++) {
			if ((corner[k] & EXPONENT) === EXPONENT) {
				throw new MorphError(
					'stl-non-finite',
					`Triangle ${t} has a coordinate that is not a finite number.`,
					'Repair or remove that triangle where the surface was made, then export again.',
					{ triangle: t, byte: at + 12 + 4 * k }
				);
			}
		}
		triangles[3 * t] = welder.add(corner[0], corner[1], corner[2]);
		triangles[3 * t + 1] = welder.add(corner[3], corner[4], corner[5]);
		triangles[3 * t + 2] = welder.add(corner[6], corner[7], corner[8]);
		const attribute = words ? words[(at >> 1) + 24] : view.getUint16(at + 48, true);
		attributes[t] = attribute;
		anyAttribute |= attribute;
		if (options.checkpoint && t % CHECKPOINT_TRIANGLES === 0) options.checkpoint(t / count);
	}
	const positions = welder.positions();
	const restored = decodePatchHeader(bytes.subarray(0, HEADER_BYTES), attributes);
	const patches: Patch[] = restored ?? [{ name: '', firstTriangle: 0, triangleCount: count }];
	options.checkpoint?.(1);
	return {
		positions,
		triangles,
		patches,
		attributes: anyAttribute && !restored ? attributes : null,
		encoding: 'binary'
	};
}
