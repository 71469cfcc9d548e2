/** Queries for what a recipe is completed from: a study's objectives, operating points and design boxes. */
import { QueryTypes } from 'sequelize';
import type { Box, BoxCreate } from '$lib/api/schemas';
import { database } from '../db/client';
import { ObjectiveModel, OperatingPointModel } from '../db/models/studies';

/** In the study's order. */
export async function findObjectives(studyId: string): Promise<ObjectiveModel[]> {
	return ObjectiveModel.findAll({ where: { studyId }, order: [['position', 'ASC']] });
}

/** In the study's order; the first is the default. */
export async function findOperatingPoints(studyId: string): Promise<OperatingPointModel[]> {
	return OperatingPointModel.findAll({ where: { studyId }, order: [['position', 'ASC']] });
}

/** The latest version of each of these boxes of the study that is not put away, in no order. */
export async function findBoxesOf(studyId: string, ids: string[]): Promise<Box[]> {
	const rows = await database().query<{ id: string; version: number; definition: BoxCreate; createdAt: Date }>(
		`SELECT b.id, v.version, v.definition, v.created_at AS "createdAt"
			FROM design_boxes b
			JOIN LATERAL (SELECT * FROM design_box_versions WHERE box_id = b.id ORDER BY version DESC LIMIT 1) v ON true
			WHERE b.study_id = $1 AND b.id = ANY($2::uuid[]) AND b.archived_at IS NULL`,
		{ bind: [studyId, ids], type: QueryTypes.SELECT }
	);
	return rows.map(({ id, version, definition, createdAt }) => ({
		...definition,
		id,
		studyId,
		version,
		updatedAt: createdAt.toISOString()
	}));
}
