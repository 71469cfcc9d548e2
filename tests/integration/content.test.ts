import { randomBytes } from 'node:crypto';
import { afterAll, beforeAll, describe, expect, inject, it } from 'vitest';
import { createDatabase, dropDatabase, execute } from '../harness/postgres';
import {
	CHUNK_BYTES,
	putContent,
	readContent,
	readWhole,
	removeContents,
	sweep
} from '../../src/lib/server/content/store';
import { closeDatabase, database } from '../../src/lib/server/db/client';
import { inTransaction } from '../../src/lib/server/repositories/transaction';

let url: string;

beforeAll(async () => {
	url = await createDatabase(inject('postgresUrl'));
	process.env.DATABASE_URL = url;
	database();
});

afterAll(async () => {
	await closeDatabase();
	await dropDatabase(inject('postgresUrl'), url);
});

const put = (bytes: Parameters<typeof putContent>[0], chunkBytes?: number) =>
	inTransaction((tx) => putContent(bytes, tx, { chunkBytes }));

const count = async (table: 'blobs' | 'contents' | 'content_chunks') =>
	Number((await execute<{ n: string }>(url, `SELECT count(*) AS n FROM ${table}`))[0].n);

async function together(pieces: AsyncIterable<Uint8Array>): Promise<Buffer> {
	const all: Uint8Array[] = [];
	for await (const piece of pieces) all.push(piece);
	return Buffer.concat(all);
}

describe('a content', () => {
	it.each([0, 1, 999, 1000, 1001, 12_345])('of %i bytes is read as it was stored, in chunks of 1000', async (size) => {
		const bytes = randomBytes(size);
		const stored = await put(bytes, 1000);
		expect(stored.size).toBe(size);
		expect(Buffer.compare(await readWhole(stored.id), bytes)).toBe(0);
	});

	it('is the same whatever the pieces it comes in', async () => {
		const bytes = randomBytes(10_000);
		const pieces = function* () {
			for (let at = 0, size = 1; at < bytes.length; at += size, size = (7 * size) % 1999) {
				yield bytes.subarray(at, at + size);
			}
		};
		const [whole, cut] = [await put(bytes, 1000), await put(pieces(), 1000)];
		expect(cut.sha256).toBe(whole.sha256);
		expect(Buffer.compare(await readWhole(cut.id), bytes)).toBe(0);
	});

	it('gives any range of its bytes', async () => {
		const bytes = randomBytes(9_500);
		const { id } = await put(bytes, 1000);
		for (const [start, end] of [
			[0, 1],
			[999, 1001],
			[1000, 2000],
			[1234, 8765],
			[9_000, 20_000],
			[9_500, 9_600]
		]) {
			expect(Buffer.compare(await together(readContent(id, { start, end })), bytes.subarray(start, end))).toBe(0);
		}
	});

	it('reads more than a batch of chunks, of a typed array of its own buffer', async () => {
		const numbers = new Float64Array(new Uint8Array(9 * CHUNK_BYTES + 8).map((_, i) => i % 251).buffer);
		const { id } = await put(numbers);
		expect(Buffer.compare(await readWhole(id), new Uint8Array(numbers.buffer))).toBe(0);
	});
});

describe('chunks', () => {
	it('that are equal are stored once, and go when nothing names them', async () => {
		const before = await count('blobs');
		const bytes = randomBytes(5000);
		const first = await put(bytes, 1000);
		const second = await put(bytes, 1000);
		expect(await count('blobs')).toBe(before + 5);
		await inTransaction((tx) => removeContents([first.id], tx));
		expect(await count('blobs')).toBe(before + 5);
		expect(Buffer.compare(await readWhole(second.id), bytes)).toBe(0);
		await inTransaction((tx) => removeContents([second.id], tx));
		expect(await count('blobs')).toBe(before);
	});

	it('are not stored when the transaction fails', async () => {
		const before = [await count('blobs'), await count('contents')];
		const failing = inTransaction(async (tx) => {
			await putContent(randomBytes(3000), tx, { chunkBytes: 1000 });
			throw new Error('after all was sent');
		});
		await expect(failing).rejects.toThrow('after all was sent');
		expect([await count('blobs'), await count('contents')]).toEqual(before);
	});

	it('are not swept from under a writer that found them present', async () => {
		const bytes = randomBytes(2000);
		const old = await put(bytes, 1000);
		const id = await inTransaction(async (tx) => {
			const again = await putContent(bytes, tx, { chunkBytes: 1000 });
			await inTransaction((other) => removeContents([old.id], other));
			expect(await sweep()).toBeNull();
			return again.id;
		});
		expect(Buffer.compare(await readWhole(id), bytes)).toBe(0);
	});
});

describe('damage', () => {
	it('is an error that names the content and the chunk, after the whole chunks before it', async () => {
		const bytes = randomBytes(5000);
		const { id } = await put(bytes, 1000);
		await execute(
			url,
			`UPDATE blobs SET bytes = set_byte(bytes, 500, (get_byte(bytes, 500) + 1) % 256)
				WHERE sha256 = (SELECT sha256 FROM content_chunks WHERE content_id = $1 AND ordinal = 3)`,
			[id]
		);
		await expect(readWhole(id)).rejects.toMatchObject({ code: 'corrupt', message: expect.stringContaining(id) });
		await expect(readWhole(id)).rejects.toThrow(/Chunk 3 .* does not match its SHA-256/);
		expect(Buffer.compare(await together(readContent(id, { end: 3000 })), bytes.subarray(0, 3000))).toBe(0);
	});

	it('includes a chunk that is missing', async () => {
		const { id } = await put(randomBytes(5000), 1000);
		await execute(url, 'DELETE FROM content_chunks WHERE content_id = $1 AND ordinal = 2', [id]);
		await expect(readWhole(id)).rejects.toThrow(/Chunk 2 .* is missing/);
		await execute(url, 'DELETE FROM content_chunks WHERE content_id = $1 AND ordinal = 4', [id]);
		await expect(together(readContent(id, { start: 3000 }))).rejects.toThrow(/Chunk 4 .* is missing/);
	});
});
