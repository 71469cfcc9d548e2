/** Uploads: a request's bytes go to a temporary file first, so that a slow or broken one holds no transaction and leaves nothing. */
import { createHash, randomUUID } from 'node:crypto';
import { createReadStream } from 'node:fs';
import { mkdir, open, readdir, rm } from 'node:fs/promises';
import { join, resolve } from 'node:path';
import { AppError } from '../errors';
import { log } from '../log';
import type { Tx } from '../repositories/transaction';
import { putContent, type StoredContent } from './store';

/** Largest file that is taken, bytes: a binary STL of 20 million triangles. */
export const UPLOAD_LIMIT = 1_000_000_000;

export interface Upload {
	readonly size: number;
	/** Stores it as a content in the caller's transaction. */
	store(tx: Tx): Promise<StoredContent>;
}

const folder = () => resolve(process.env.PLANISH_DATA ?? 'data', 'uploads');

const tooLarge = (filename: string) =>
	new AppError('too-large', `${filename} is larger than ${UPLOAD_LIMIT / 1e6} MB.`, {
		mend: 'Coarsen the surface, or leave out parts that will not move. A binary STL is a fifth of an ASCII one.'
	});

/**
 * Receives a file and hands it to the work; the temporary file is gone afterwards, whatever happened.
 *
 * @param body the bytes; null: none were sent
 * @param announced Content-Length, where the sender gave it: a file that is too large is refused before it is read
 * @throws AppError too-large; bad-file when it is empty or broke off
 */
export async function withUpload<T>(
	body: AsyncIterable<Uint8Array> | Iterable<Uint8Array> | null,
	{ filename, announced }: { filename: string; announced: number | null },
	work: (upload: Upload) => Promise<T>
): Promise<T> {
	if (announced !== null && announced > UPLOAD_LIMIT) throw tooLarge(filename);
	await mkdir(folder(), { recursive: true, mode: 0o700 });
	const path = join(folder(), `${process.pid}-${randomUUID()}.part`);
	try {
		const { size, sha256 } = await receive(body ?? [], path, filename);
		if (size === 0) {
			throw new AppError('bad-file', `${filename} is empty: no bytes arrived.`, {
				mend: 'Send the file’s bytes as the request’s body.'
			});
		}
		if (announced !== null && size !== announced) throw brokeOff(filename, size);
		return await work({
			size,
			async store(tx) {
				const content = await putContent(createReadStream(path, { highWaterMark: 1 << 20 }), tx);
				if (content.sha256 !== sha256) throw new Error(`${path} changed between writing and reading.`);
				return content;
			}
		});
	} finally {
		await rm(path, { force: true });
	}
}

const brokeOff = (filename: string, size: number, cause?: unknown) =>
	new AppError('bad-file', `The upload of ${filename} broke off after ${size} bytes; nothing of it was kept.`, {
		mend: 'Send it again.',
		cause
	});

async function receive(body: AsyncIterable<Uint8Array> | Iterable<Uint8Array>, path: string, filename: string) {
	const hash = createHash('sha256');
	const file = await open(path, 'wx', 0o600);
	let size = 0;
	try {
		const pieces = Symbol.asyncIterator in body ? body[Symbol.asyncIterator]() : body[Symbol.iterator]();
		for (;;) {
			const { done, value } = await Promise.resolve(pieces.next()).catch((cause) => {
				throw brokeOff(filename, size, cause);
			});
			if (done) break;
			size += value.length;
			// The rest is not read: the answer says so while the sender still sends.
			if (size > UPLOAD_LIMIT) throw tooLarge(filename);
			hash.update(value);
			await file.write(value);
		}
	} finally {
		await file.close();
	}
	return { size, sha256: hash.digest('hex') };
}

/** Removes what processes that are gone have left in the folder. */
export async function clearUploads(): Promise<void> {
	for (const name of await readdir(folder()).catch(() => [])) {
		const pid = Number(/^(\d+)-.*\.part$/.exec(name)?.[1]);
		if (!pid || (pid !== process.pid && isAlive(pid))) continue;
		log.info({ name }, 'removing an unfinished upload');
		await rm(join(folder(), name), { force: true });
	}
}

function isAlive(pid: number): boolean {
	try {
		process.kill(pid, 0);
		return true;
	} catch (error) {
		return (error as NodeJS.ErrnoException).code === 'EPERM';
	}
}
