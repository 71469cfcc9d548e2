/** Queries of the content store: blobs, contents and their chunks. */
import type { Client } from 'pg';
import { to as copyTo } from 'pg-copy-streams';
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

/**
 * Chunks with ordinals from `first` to `last` (both included), by ordinal; their bytes are views of one buffer. COPY hands the
 * bytes over as they are, where a query would send them as hexadecimal text: several times the speed.
 */
export async function readChunks(contentId: string, first: number, last: number): Promise<ChunkRow[]> {
	const manager = database().connectionManager as unknown as ClientPool;
	const client = await manager.getConnection({ type: 'read' });
	try {
		// COPY takes no parameters.
		const stream = client.query(
			copyTo(
				`COPY (
					SELECT c.ordinal, c.sha256, b.bytes FROM content_chunks c LEFT JOIN blobs b USING (sha256)
						WHERE c.content_id = '${uuid(contentId)}' AND c.ordinal BETWEEN ${Number(first)} AND ${Number(last)}
						ORDER BY c.ordinal
				) TO STDOUT (FORMAT binary)`
			)
		);
		const pieces: Buffer[] = [];
		for await (const piece of stream) pieces.push(piece);
		return parseCopied(Buffer.concat(pieces)).map(([ordinal, sha256, bytes]) => ({
			ordinal: ordinal!.readInt32BE(),
			sha256: sha256!,
			bytes
		}));
	} finally {
		manager.releaseConnection(client);
	}
}

/** Sequelize's pool, which lends out pg's clients; its own types know neither. */
interface ClientPool {
	getConnection(options: { type: 'read' }): Promise<Client>;
	releaseConnection(client: Client): void;
}

function uuid(id: string): string {
	if (!/^[0-9a-f]{8}(-[0-9a-f]{4}){3}-[0-9a-f]{12}$/i.test(id)) throw new TypeError(`"${id}" is no UUID.`);
	return id;
}

/** Signature (11 bytes), flags and length of the extension (4 each): PostgreSQL manual, COPY, "Binary Format". */
const COPY_HEADER_BYTES = 19;

/** The rows of COPY's binary format; null for NULL. */
function parseCopied(bytes: Buffer): (Buffer | null)[][] {
	const rows: (Buffer | null)[][] = [];
	let at = COPY_HEADER_BYTES + bytes.readInt32BE(COPY_HEADER_BYTES - 4);
	for (let fields = bytes.readInt16BE(at); fields >= 0; fields = bytes.readInt16BE(at)) {
		at += 2;
		const row: (Buffer | null)[] = [];
		for (let i = 0; i < fields; i++) {
			const length = bytes.readInt32BE(at);
			at += 4;
			row.push(length < 0 ? null : bytes.subarray(at, at + length));
			at += Math.max(0, length);
		}
		rows.push(row);
	}
	return rows;
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
