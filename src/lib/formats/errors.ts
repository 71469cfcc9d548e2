import { MorphError, type MorphPlace } from '$lib/morph';
import type { Limits } from './types';

/** 1 for the first line; CR, LF and CRLF each end one. Lines are counted only here: readers keep byte offsets. */
export function lineAt(bytes: Uint8Array, at: number): number {
	let line = 1;
	const end = Math.min(at, bytes.length);
	for (let i = 0; i < end; i++) {
		if (bytes[i] === 10) line++;
		else if (bytes[i] === 13 && bytes[i + 1] !== 10) line++;
	}
	return line;
}

/** At most 40 printable characters of a text, for messages. */
export function shown(text: string): string {
	const clean = text.replace(/[^\x20-\x7e\u00a0-\uffff]+/g, '.');
	return clean.length > 40 ? `${clean.slice(0, 40)}...` : clean;
}

export const REEXPORT = 'Export the surface again, or save it in another of the formats STL, OBJ, PLY, VTK or VTP.';
const CUT_OFF = 'The file was cut off: export or upload it again.';

export const syntax = (message: string, place: MorphPlace, mend = REEXPORT) =>
	new MorphError('file-syntax', message, mend, place);

/** A fault in a text, with its line. */
export const syntaxAt = (bytes: Uint8Array, byte: number, message: string, mend = REEXPORT) => {
	const line = lineAt(bytes, byte);
	return syntax(`Line ${line}: ${message}`, { line, byte }, mend);
};

export const truncated = (message: string, place: MorphPlace) =>
	new MorphError('file-truncated', message, CUT_OFF, place);

export const unsupported = (message: string, mend: string, place?: MorphPlace) =>
	new MorphError('file-unsupported', message, mend, place ?? { byte: 0 });

export const nonFinite = (message: string, place: MorphPlace) =>
	new MorphError(
		'file-non-finite',
		message,
		'Repair or remove that point where the surface was made, then export again.',
		place
	);

export const empty = (message: string, mend = 'Export a surface with at least one triangle.', byte = 0) =>
	new MorphError('file-empty', message, mend, { byte });

const grouped = (n: number) => n.toLocaleString('en-GB');

export const tooManyTriangles = (count: number, limits: Limits, byte = 0) =>
	new MorphError(
		'file-too-large',
		`The file holds ${grouped(count)} triangles or more; at most ${grouped(limits.maxTriangles)} are read.`,
		'Coarsen the surface, or leave out parts that do not matter here.',
		{ byte }
	);

export const tooManyBytes = (bytes: number, limits: Limits, what: string) =>
	new MorphError(
		'file-too-large',
		`${what} takes ${grouped(bytes)} bytes or more; at most ${grouped(limits.maxBytes)} are read.`,
		'Save it in a binary encoding, coarsen the surface, or leave out parts that do not matter here.',
		{ byte: 0 }
	);
