import JSZip from 'jszip';
import { MorphError } from '$lib/morph';
import { empty, shown, syntax, tooManyBytes, truncated } from './errors';
import { InflateError, gunzip } from './inflate-node';
import type { Limits, Packing } from './types';

export interface Unpacked {
	bytes: Uint8Array;
	/** Name of the file inside. */
	filename: string;
	packing: Packing;
}

/** Files that archivers add of their own accord. */
const CLUTTER = /(^|\/)(__MACOSX\/|\.|Thumbs\.db$|desktop\.ini$)/i;
const MAX_ENTRIES = 10_000;
const GZIP_TRAILER = 4;

export const isGzip = (bytes: Uint8Array) => bytes[0] === 0x1f && bytes[1] === 0x8b;
export const isZip = (bytes: Uint8Array) =>
	bytes[0] === 0x50 && bytes[1] === 0x4b && ((bytes[2] === 3 && bytes[3] === 4) || (bytes[2] === 5 && bytes[3] === 6));

function ungzip(bytes: Uint8Array, filename: string, limits: Limits): Unpacked {
	if (bytes.length >= 18) {
		// The trailer tells the size (modulo 2^32): a file that is over is refused before it is unpacked.
		const view = new DataView(bytes.buffer, bytes.byteOffset, bytes.byteLength);
		const size = view.getUint32(bytes.length - GZIP_TRAILER, true);
		if (size > limits.maxBytes && size < 1100 * bytes.length)
			throw tooManyBytes(size, limits, `"${shown(filename)}" unpacked`);
	}
	try {
		return { bytes: gunzip(bytes, limits.maxBytes), filename: filename.replace(/\.gz(ip)?$/i, ''), packing: 'gzip' };
	} catch (thrown) {
		if (!(thrown instanceof InflateError)) throw thrown;
		if (thrown.fault === 'too-large') throw tooManyBytes(limits.maxBytes, limits, `"${shown(filename)}" unpacked`);
		if (thrown.fault === 'cut-off')
			throw truncated(`The gzip file "${shown(filename)}" ends too early.`, { byte: bytes.length });
		throw syntax(
			`The gzip file "${shown(filename)}" cannot be unpacked: its data are damaged.`,
			{ byte: 0 },
			'Pack or upload the file again.'
		);
	}
}

/** The one file of an archive whose name ends with one of the endings, or the only file that is there. */
async function unzip(
	bytes: Uint8Array,
	filename: string,
	endings: RegExp,
	what: string,
	limits: Limits
): Promise<Unpacked> {
	const damaged = (detail: string) =>
		syntax(
			`The archive "${shown(filename)}" cannot be unpacked: ${detail}.`,
			{ byte: 0 },
			'Pack the file again as a plain zip without a password, or upload it as it is.'
		);
	let zip: JSZip;
	try {
		zip = await JSZip.loadAsync(bytes);
	} catch (thrown) {
		const message = thrown instanceof Error ? thrown.message : '';
		throw damaged(/encrypted/i.test(message) ? 'it is protected by a password' : 'its directory is damaged or cut off');
	}
	const files = Object.values(zip.files).filter((entry) => !entry.dir && !CLUTTER.test(entry.name));
	if (files.length === 0) throw empty(`The archive "${shown(filename)}" holds no file.`, `Pack one ${what} in it.`);
	if (files.length > MAX_ENTRIES) throw damaged(`it holds ${files.length} files`);
	const fitting = files.filter((entry) => endings.test(entry.name));
	const chosen = fitting.length > 0 ? fitting : files.length === 1 ? files : [];
	if (chosen.length !== 1) {
		const list = (chosen.length > 0 ? chosen : files)
			.slice(0, 8)
			.map((entry) => `"${shown(entry.name)}"`)
			.join(', ');
		const more = Math.max(chosen.length, chosen.length > 0 ? 0 : files.length) - 8;
		throw new MorphError(
			'file-unsupported',
			chosen.length > 0
				? `The archive "${shown(filename)}" holds ${chosen.length} files of this kind: ${list}${more > 0 ? ` and ${more} more` : ''}.`
				: `The archive "${shown(filename)}" holds no ${what} among its ${files.length} files: ${list}${more > 0 ? ` and ${more} more` : ''}.`,
			`Pack exactly one ${what} in it, or upload the file itself.`,
			{ byte: 0 }
		);
	}
	const [entry] = chosen;
	return { bytes: await entryBytes(entry, limits, damaged), filename: entry.name.replace(/^.*\//, ''), packing: 'zip' };
}

/** Bytes of an entry, stopped as soon as they pass the limit, whatever the directory claims. */
function entryBytes(
	entry: JSZip.JSZipObject,
	limits: Limits,
	damaged: (detail: string) => MorphError
): Promise<Uint8Array> {
	return new Promise((resolve, reject) => {
		const parts: Uint8Array[] = [];
		let size = 0;
		// Not in jszip's types: its documented StreamHelper, the only way to stop half-way.
		const stream = (
			entry as unknown as { internalStream(type: 'uint8array'): JSZip.JSZipStreamHelper<Uint8Array> }
		).internalStream('uint8array');
		stream
			.on('data', (part) => {
				size += part.length;
				if (size > limits.maxBytes) {
					stream.pause();
					parts.length = 0;
					reject(tooManyBytes(size, limits, `"${shown(entry.name)}" unpacked`));
				} else parts.push(part);
			})
			.on('error', () => reject(damaged(`the data of "${shown(entry.name)}" are damaged`)))
			.on('end', () => {
				const out = new Uint8Array(size);
				let at = 0;
				for (const part of parts) {
					out.set(part, at);
					at += part.length;
				}
				resolve(out);
			})
			.resume();
	});
}

/**
 * Unpacks gzip, and zip with exactly one fitting file in it (which may itself be gzipped).
 * @param bytes borrowed; returned as they are when they are not packed
 * @param endings what a fitting name inside a zip ends with
 * @param what what the archive should hold, in words
 * @throws MorphError file-syntax, file-truncated, file-unsupported, file-empty, file-too-large
 */
export async function unpack(
	bytes: Uint8Array,
	filename: string,
	limits: Limits,
	endings: RegExp,
	what: string
): Promise<Unpacked> {
	if (bytes.length > limits.maxBytes) throw tooManyBytes(bytes.length, limits, `"${shown(filename)}"`);
	if (isGzip(bytes)) return ungzip(bytes, filename, limits);
	if (!isZip(bytes)) return { bytes, filename, packing: 'none' };
	const inner = await unzip(bytes, filename, endings, what, limits);
	if (!isGzip(inner.bytes)) return inner;
	return { ...ungzip(inner.bytes, inner.filename, limits), packing: 'zip' };
}
