/** Queries of the demo's loading. */
import { QueryTypes } from 'sequelize';
import { database } from '../db/client';
import type { Tx } from './transaction';

/** What the record of events says when the demo is complete. */
export const LOADED = 'demo.loaded';

/**
 * What is there already: the demo as a whole (also when its study has been changed since), a part of it that an interrupted
 * loading left, or studies of somebody's.
 */
export async function lookForStudies(): Promise<{ loaded: boolean; unfinished: string[]; others: boolean }> {
	const select = { type: QueryTypes.SELECT } as const;
	const events = await database().query('SELECT FROM audit_events WHERE action = $1 LIMIT 1', {
		...select,
		bind: [LOADED]
	});
	const loaded = events.length > 0;
	const studies = await database().query<{ id: string; invented: boolean }>('SELECT id, invented FROM studies', select);
	const unfinished = loaded ? [] : studies.filter((study) => study.invented).map((study) => study.id);
	return { loaded, unfinished, others: studies.length > unfinished.length };
}

/** Marks a study as invented and gives its first operating point the demo's name and yaw. */
export async function makeInvented(
	studyId: string,
	point: { name: string; yaw: number | null; weight: number }
): Promise<void> {
	await database().query('UPDATE studies SET invented = true WHERE id = $1', { bind: [studyId] });
	await database().query(
		'UPDATE operating_points SET name = $2, yaw = $3, weight = $4 WHERE study_id = $1 AND position = 0',
		{
			bind: [studyId, point.name, point.yaw, point.weight]
		}
	);
}

/** Removes a study with all that hangs on it. */
export async function removeStudy(studyId: string, tx: Tx): Promise<void> {
	const rows = await database().query<{ id: string }>(
		`SELECT unnest(ARRAY[triangles_id, attributes_id]) AS id FROM topologies WHERE study_id = $1
			UNION SELECT unnest(ARRAY[positions_id, original_id]) FROM shapes WHERE study_id = $1
			UNION SELECT unnest(ARRAY[m.original_id, m.values_id]) FROM maps m JOIN shapes s ON s.id = m.shape_id WHERE s.study_id = $1
			UNION SELECT lattices_id FROM moves WHERE study_id = $1
			UNION SELECT (payload ->> 'uploadId')::uuid FROM jobs WHERE study_id = $1`,
		{ bind: [studyId], type: QueryTypes.SELECT, transaction: tx }
	);
	await database().query('DELETE FROM studies WHERE id = $1', { bind: [studyId], transaction: tx });
	const ids = rows.map((row) => row.id).filter(Boolean);
	await database().query('DELETE FROM contents WHERE id = ANY($1::uuid[])', { bind: [ids], transaction: tx });
}
