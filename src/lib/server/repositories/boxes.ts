/** Queries about design boxes. A box's definition is that of its newest version; no version is ever changed. */
import { QueryTypes } from 'sequelize';
import type { BoxCreate } from '$lib/api/schemas';
import { database } from '../db/client';
import { DesignBoxModel, DesignBoxVersionModel } from '../db/models/studies';
import type { Tx } from './transaction';

/** A box in its newest version. */
export interface BoxRow {
	id: string;
	studyId: string;
	archivedAt: Date | null;
	version: number;
	definition: BoxCreate;
	/** When the newest version was made. */
	updatedAt: Date;
}

const NEWEST = `
	SELECT b.id, b.study_id AS "studyId", b.archived_at AS "archivedAt", v.version, v.definition, v.created_at AS "updatedAt"
	FROM design_boxes b
	JOIN LATERAL (SELECT * FROM design_box_versions WHERE box_id = b.id ORDER BY version DESC LIMIT 1) v ON true`;

/** A study's boxes that are not put away, the oldest first. */
export const listBoxes = (studyId: string, tx?: Tx): Promise<BoxRow[]> =>
	database().query<BoxRow>(`${NEWEST} WHERE b.study_id = $1 AND b.archived_at IS NULL ORDER BY b.created_at, b.id`, {
		bind: [studyId],
		type: QueryTypes.SELECT,
		transaction: tx
	});

/** Those of the study's boxes that are named and not put away, in no order. */
export const findBoxes = (studyId: string, ids: string[], tx?: Tx): Promise<BoxRow[]> =>
	database().query<BoxRow>(`${NEWEST} WHERE b.study_id = $1 AND b.archived_at IS NULL AND b.id = ANY($2::uuid[])`, {
		bind: [studyId, ids],
		type: QueryTypes.SELECT,
		transaction: tx
	});

/** The box, its row locked until the transaction ends; also one that is put away. */
export async function lockBox(studyId: string, id: string, tx: Tx): Promise<BoxRow | null> {
	const rows = await database().query<BoxRow>(`${NEWEST} WHERE b.study_id = $1 AND b.id = $2 FOR UPDATE OF b`, {
		bind: [studyId, id],
		type: QueryTypes.SELECT,
		transaction: tx
	});
	return rows[0] ?? null;
}

export async function insertBox(studyId: string, tx: Tx): Promise<string> {
	database();
	return (await DesignBoxModel.create({ studyId }, { transaction: tx })).id;
}

export async function insertBoxVersion(
	values: { boxId: string; version: number; definition: BoxCreate; createdBy: string },
	tx: Tx
): Promise<void> {
	await DesignBoxVersionModel.create(values, { transaction: tx });
}

export async function setBoxArchived(id: string, archivedAt: Date | null, tx: Tx): Promise<void> {
	await DesignBoxModel.update({ archivedAt }, { where: { id }, transaction: tx });
}
