/**
 * The content store: every large thing is an ordered list of chunks, each kept once under its SHA-256. A chunk is verified
 * whenever it is read, so damaged storage gives an error and never wrong data.
 */
import { createHash, randomUUID } from 'node:crypto';
import { AppError } from '../errors';
import * as contents from '../repositories/contents';
import { inTransaction, type Tx } from '../repositories/transaction';

/** 16,384 vertices of three float32: a child shape shares every run of vertices that did not move. */
export const POSITION_CHUNK_BYTES = 196_608;
export const CHUNK_BYTES = 1 << 20;

/** Bytes sent to, or asked of, the database at once. */
const BATCH_BYTES = 4 << 20;

export type Bytes = AsyncIterable<Uint8Array> | Iterable<Uint8Array> | ArrayBufferView;

export interface StoredContent {
	id: string;
	size: number;
	/** Of the whole, hex. */
	sha256: string;
}

const sha256 = (bytes: Uint8Array) => createHash('sha256').update(bytes).digest();

/**
 * Stores bytes as a new content inside the caller's transaction.
 *
 * @param source pieces of any size, or one typed array (stored as the machine holds it: little-endian); borrowed, and read
 *   before the promise resolves
 * @param options.chunkBytes size of the chunks
 */
export async function putContent(
	source: Bytes,
	tx: Tx,
	{ chunkBytes = CHUNK_BYTES }: { chunkBytes?: number } = {}
): Promise<StoredContent> {
	await contents.keepBlobs(tx);
	const whole = createHash('sha256');
	const hashes: Buffer[] = [];
	const perBatch = Math.max(1, Math.floor(BATCH_BYTES / chunkBytes));
	let batch: { sha256: Buffer; bytes: Buffer }[] = [];
	let size = 0;
	const flush = async () => {
		const present = await contents.presentBlobs(
			batch.map((chunk) => chunk.sha256),
			tx
		);
		const missing = new Map<string, (typeof batch)[number]>();
		for (const chunk of batch) {
			const key = chunk.sha256.toString('hex');
			if (!present.has(key)) missing.set(key, chunk);
		}
		// One order for all writers, so that two of them storing the same chunks cannot wait for each other in a ring.
		await contents.insertBlobs(
			[...missing.keys()].sort().map((key) => missing.get(key)!),
			tx
		);
		batch = [];
	};
	for await (const bytes of chunked(source, chunkBytes)) {
		whole.update(bytes);
		size += bytes.length;
		const chunk = { sha256: sha256(bytes), bytes };
		hashes.push(chunk.sha256);
		batch.push(chunk);
		if (batch.length >= perBatch) await flush();
	}
	if (batch.length > 0) await flush();
	const digest = whole.digest();
	const id = randomUUID();
	await contents.insertContent({ id, sha256: digest, size, chunkBytes }, hashes, tx);
	return { id, size, sha256: digest.toString('hex') };
}

/** Cuts any run of pieces into chunks of one size; only the last may be shorter. Chunks of a typed array are views of it. */
async function* chunked(source: Bytes, chunkBytes: number): AsyncGenerator<Buffer> {
	if (ArrayBuffer.isView(source)) {
		for (let at = 0; at < source.byteLength; at += chunkBytes) {
			const length = Math.min(chunkBytes, source.byteLength - at);
			yield Buffer.from(source.buffer as ArrayBuffer, source.byteOffset + at, length);
		}
		return;
	}
	let chunk = Buffer.allocUnsafeSlow(chunkBytes);
	let filled = 0;
	for await (const piece of source) {
		for (let at = 0; at < piece.length;) {
			const length = Math.min(piece.length - at, chunkBytes - filled);
			chunk.set(piece.subarray(at, at + length), filled);
			at += length;
			filled += length;
			if (filled === chunkBytes) {
				yield chunk;
				// The one before may still wait in a batch.
				chunk = Buffer.allocUnsafeSlow(chunkBytes);
				filled = 0;
			}
		}
	}
	if (filled > 0) yield chunk.subarray(0, filled);
}

/** @throws AppError corrupt when there is no such content: whoever holds an id was promised that it stays */
export async function contentInfo(id: string): Promise<StoredContent> {
	const row = await requireContent(id);
	return { id: row.id, size: row.size, sha256: row.sha256.toString('hex') };
}

async function requireContent(id: string): Promise<contents.ContentRow> {
	const row = await contents.findContent(id);
	if (!row) throw new AppError('corrupt', `Content ${id} is missing.`);
	return row;
}

/**
 * Reads a content, or the bytes from `start` (included) to `end` (excluded), chunk by chunk, each verified before it is handed
 * out. Holds no connection while the consumer is busy.
 *
 * @throws AppError corrupt naming the content and the chunk
 */
export async function* readContent(
	id: string,
	{ start = 0, end = Infinity }: { start?: number; end?: number } = {}
): AsyncGenerator<Uint8Array> {
	const content = await requireContent(id);
	const { chunkBytes } = content;
	const stop = Math.min(end, content.size);
	if (start >= stop) return;
	const last = Math.ceil(stop / chunkBytes) - 1;
	const perBatch = Math.max(1, Math.floor(BATCH_BYTES / chunkBytes));
	const ask = (from: number) => {
		const rows = contents.readChunks(id, from, Math.min(last, from + perBatch - 1));
		// The consumer may leave before this is awaited.
		rows.catch(() => undefined);
		return rows;
	};
	let first = Math.floor(start / chunkBytes);
	let next = ask(first);
	while (first <= last) {
		const rows = await next;
		const expected = Math.min(perBatch, last - first + 1);
		if (first + perBatch <= last) next = ask(first + perBatch);
		for (let i = 0; i < expected; i++) {
			const ordinal = first + i;
			const bytes = verify(content, ordinal, rows[i]);
			const base = ordinal * chunkBytes;
			yield bytes.subarray(Math.max(0, start - base), Math.min(bytes.length, stop - base));
		}
		first += expected;
	}
}

function verify(content: contents.ContentRow, ordinal: number, row: contents.ChunkRow | undefined): Buffer {
	const size = Math.min(content.chunkBytes, content.size - ordinal * content.chunkBytes);
	const fault = (what: string) =>
		new AppError('corrupt', `Chunk ${ordinal} of content ${content.id} ${what}.`, {
			mend: 'The stored data is damaged: restore the database from a backup. Nothing wrong was handed out.'
		});
	if (!row || row.ordinal !== ordinal || !row.bytes) throw fault('is missing');
	if (row.bytes.length !== size) throw fault(`has ${row.bytes.length} bytes instead of ${size}`);
	if (!sha256(row.bytes).equals(row.sha256)) throw fault('does not match its SHA-256');
	return row.bytes;
}

/**
 * Reads a whole content into one array of its own buffer (so that a typed array may be laid over it).
 *
 * @throws AppError corrupt as readContent
 */
export async function readWhole(id: string): Promise<Uint8Array<ArrayBuffer>> {
	const { size } = await requireContent(id);
	const whole = new Uint8Array(size);
	let at = 0;
	for await (const bytes of readContent(id)) {
		whole.set(bytes, at);
		at += bytes.length;
	}
	return whole;
}

/** Takes contents away inside the caller's transaction; chunks that somebody is about to share go with the next sweep. */
export async function removeContents(ids: string[], tx: Tx): Promise<void> {
	await contents.deleteContents(ids, tx);
}

/**
 * Frees chunks that no content names any more.
 *
 * @returns how many, or null when somebody is storing just now and it was left for later
 */
export function sweep(): Promise<number | null> {
	return inTransaction((tx) => contents.deleteUnnamedBlobs(tx));
}
