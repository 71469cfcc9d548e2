/** Queries of the content store: blobs, contents and their chunks. */
import { QueryTypes } from 'sequelize';
import { database } from '../db/client';
import { ContentModel } from '../db/models/content';
import type { Tx } from './transaction';

/** Writers share this lock while they store; the sweeper of unnamed blobs needs it alone. */
const STORE_LOCK = 7_264_502;

export interface ContentRow {
	id: string;
	sha256: Buffer;
	size: number;
	chunkBytes: number;
}

export interface ChunkRow {
	ordinal: number;
	sha256: Buffer;
	/** null: the blob is not there. */
	bytes: Buffer | null;
}

/** Keeps unnamed blobs in place until the transaction ends, so that one found present stays present. */
export async function keepBlobs(tx: Tx): Promise<void> {
	await database().query('SELECT pg_advisory_xact_lock_shared($1)', { bind: [STORE_LOCK], transaction: tx });
}

/** @returns those of the hashes that are stored already, in hex */
export async function presentBlobs(hashes: Buffer[], tx: Tx): Promise<Set<string>> {
	const rows = await database().query<{ sha256: Buffer }>('SELECT sha256 FROM blobs WHERE sha256 = ANY($1::bytea[])', {
		bind: [hashes],
		transaction: tx,
		type: QueryTypes.SELECT
	});
	return new Set(rows.map((row) => row.sha256.toString('hex')));
}

/** Bytes are sent as they are (bind): ten times the speed of escaped text. */
export async function insertBlobs(blobs: { sha256: Buffer; bytes: Buffer }[], tx: Tx): Promise<void> {
	if (blobs.length === 0) return;
	const values = blobs.map((_, i) => `($${3 * i + 1}, $${3 * i + 2}, $${3 * i + 3})`).join(', ');
	await database().query(`INSERT INTO blobs (sha256, size, bytes) VALUES ${values} ON CONFLICT DO NOTHING`, {
		bind: blobs.flatMap((blob) => [blob.sha256, blob.bytes.length, blob.bytes]),
		transaction: tx
	});
}

/** @param hashes of the chunks, in order */
export async function insertContent(content: ContentRow, hashes: Buffer[], tx: Tx): Promise<void> {
	await ContentModel.create(content, { transaction: tx });
	if (hashes.length === 0) return;
	await database().query(
		`INSERT INTO content_chunks (content_id, ordinal, sha256)
			SELECT $1, i - 1, h FROM unnest($2::bytea[]) WITH ORDINALITY AS t (h, i)`,
		{ bind: [content.id, hashes], transaction: tx }
	);
}

export async function findContent(id: string, tx?: Tx): Promise<ContentRow | null> {
	const row = await ContentModel.findByPk(id, { transaction: tx });
	return row && { id: row.id, sha256: row.sha256, size: Number(row.size), chunkBytes: row.chunkBytes };
}

/** Chunks with ordinals from `first` to `last` (both included), by ordinal. */
export function readChunks(contentId: string, first: number, last: number, tx?: Tx): Promise<ChunkRow[]> {
	return database().query<ChunkRow>(
		`SELECT c.ordinal, c.sha256, b.bytes FROM content_chunks c LEFT JOIN blobs b USING (sha256)
			WHERE c.content_id = $1 AND c.ordinal BETWEEN $2 AND $3 ORDER BY c.ordinal`,
		{ bind: [contentId, first, last], transaction: tx, type: QueryTypes.SELECT }
	);
}

/** Hashes of all chunks of a content, in hex, by ordinal. */
export async function chunkHashes(contentId: string): Promise<string[]> {
	const rows = await database().query<{ sha256: Buffer }>(
		'SELECT sha256 FROM content_chunks WHERE content_id = $1 ORDER BY ordinal',
		{ bind: [contentId], type: QueryTypes.SELECT }
	);
	return rows.map((row) => row.sha256.toString('hex'));
}

/**
 * Takes contents away, and with them the blobs that no other content names. One that a shape, map or move names stays (foreign
 * keys refuse it).
 */
export async function deleteContents(ids: string[], tx: Tx): Promise<void> {
	if (ids.length === 0) return;
	const rows = await database().query<{ sha256: Buffer }>(
		'SELECT DISTINCT sha256 FROM content_chunks WHERE content_id = ANY($1::uuid[])',
		{ bind: [ids], transaction: tx, type: QueryTypes.SELECT }
	);
	await ContentModel.destroy({ where: { id: ids }, transaction: tx });
	const hashes = rows.map((row) => row.sha256);
	await deleteUnnamedBlobs(tx, hashes);
}

/**
 * Removes blobs that no content names. Does nothing while somebody stores, since a writer may be about to name one.
 *
 * @param hashes only these are looked at
 * @returns how many were removed, or null when it was not the moment
 */
export async function deleteUnnamedBlobs(tx: Tx, hashes?: Buffer[]): Promise<number | null> {
	const [lock] = await database().query<{ free: boolean }>('SELECT pg_try_advisory_xact_lock($1) AS free', {
		bind: [STORE_LOCK],
		transaction: tx,
		type: QueryTypes.SELECT
	});
	if (!lock.free) return null;
	const rows = await database().query(
		`DELETE FROM blobs b WHERE NOT EXISTS (SELECT FROM content_chunks c WHERE c.sha256 = b.sha256)
			${hashes ? 'AND b.sha256 = ANY($1::bytea[])' : ''} RETURNING size`,
		{ bind: hashes && [hashes], transaction: tx, type: QueryTypes.SELECT }
	);
	return rows.length;
}
