import type { Patch } from './types';

export const HEADER_BYTES = 80;
/** Header and triangle count. */
export const RECORD_START = 84;
/** 12 float32 (normal, three corners) and one attribute word, little-endian, unaligned. */
export const RECORD_BYTES = 50;
/** Attribute words are 16 bits, and number 0 means "no patch". */
export const MAX_NUMBERED_PATCHES = 65535;

const MARK = 'Planish patches';
const SEPARATOR = '\t';

const clean = (name: string) => name.replace(/[\t\r\n\0]+/g, ' ').trim();

/** UTF-8 bytes of a name, cut at a whole character. */
function cut(name: string, bytes: number): string {
	const encoder = new TextEncoder();
	let text = name;
	while (encoder.encode(text).length > bytes) text = Array.from(text).slice(0, -1).join('');
	return text;
}

/** Whether the 80-byte header holds the patches' names unshortened. */
export function headerHoldsNames(patches: Patch[]): boolean {
	const text = [MARK, ...patches.map((p) => clean(p.name))].join(SEPARATOR);
	return patches.length <= MAX_NUMBERED_PATCHES && new TextEncoder().encode(text).length <= HEADER_BYTES;
}

/**
 * An 80-byte header that carries the patches' names; it never begins with "solid". Names that do not fit are shortened
 * alike; with too many patches only their number is kept.
 */
export function encodePatchHeader(patches: Patch[]): Uint8Array {
	const header = new Uint8Array(HEADER_BYTES);
	const named = patches.length > 1 || patches.some((p) => p.name !== '');
	let text = 'Planish';
	if (named) {
		const names = patches.map((p) => clean(p.name));
		text = [MARK, ...names].join(SEPARATOR);
		const encoder = new TextEncoder();
		let longest = Math.max(...names.map((n) => encoder.encode(n).length));
		while (encoder.encode(text).length > HEADER_BYTES && longest > 0) {
			longest--;
			text = [MARK, ...names.map((n) => cut(n, longest))].join(SEPARATOR);
		}
		if (encoder.encode(text).length > HEADER_BYTES) text = `${MARK}#${patches.length}`;
	}
	header.set(new TextEncoder().encode(text));
	return header;
}

/**
 * The patches that our own header and numbers describe, or null for anybody else's file (also for a file whose
 * triangles were reordered since).
 */
export function decodePatchHeader(header: Uint8Array, attributes: Uint16Array): Patch[] | null {
	let end = header.indexOf(0);
	if (end < 0) end = HEADER_BYTES;
	const text = new TextDecoder().decode(header.subarray(0, end));
	let names: string[];
	const counted = new RegExp(`^${MARK}#(\\d+)$`).exec(text);
	if (counted) {
		const n = Number(counted[1]);
		if (n > MAX_NUMBERED_PATCHES) return null;
		names = Array.from({ length: n }, (_, i) => `patch ${i + 1}`);
	} else if (text.startsWith(MARK + SEPARATOR)) names = text.split(SEPARATOR).slice(1);
	else return null;
	const count = attributes.length;
	if (names.length === 1) {
		for (let t = 0; t < count; t++) if (attributes[t] !== 0) return null;
		return [{ name: names[0], firstTriangle: 0, triangleCount: count }];
	}
	const patches: Patch[] = [];
	let t = 0;
	for (let k = 0; k < names.length; k++) {
		const first = t;
		while (t < count && attributes[t] === k + 1) t++;
		patches.push({ name: names[k], firstTriangle: first, triangleCount: t - first });
	}
	return t === count ? patches : null;
}
