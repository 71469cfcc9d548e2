/** The study that a path's id belongs to, found only for its members. */
import { QueryTypes } from 'sequelize';
import type { Subject } from '$lib/api/contract/operation';
import type { Role } from '$lib/api/schemas/common';
import { database } from '../db/client';
import type { Caller } from '../auth/caller';

export type StudySubject = Exclude<Subject, 'user' | 'token' | 'none'>;

const OWNING_STUDY: Record<StudySubject, string> = {
	study: 'SELECT id AS study_id FROM studies WHERE id = $1',
	shape: 'SELECT study_id FROM shapes WHERE id = $1',
	topology: 'SELECT study_id FROM topologies WHERE id = $1',
	map: 'SELECT shapes.study_id FROM maps JOIN shapes ON shapes.id = maps.shape_id WHERE maps.id = $1',
	box: 'SELECT study_id FROM design_boxes WHERE id = $1',
	keepOut: 'SELECT study_id FROM keep_outs WHERE id = $1',
	lock: 'SELECT study_id FROM locks WHERE id = $1',
	objective: 'SELECT study_id FROM objectives WHERE id = $1',
	job: 'SELECT study_id FROM jobs WHERE id = $1'
};

/** @returns null when there is no such thing, or the caller (or the caller's token) has no part in its study */
export async function findStudyAccess(
	subject: StudySubject,
	id: string,
	{ userId, tokenStudyId }: Caller
): Promise<{ studyId: string; role: Role } | null> {
	const rows = await database().query<{ studyId: string; role: Role }>(
		`SELECT member.study_id AS "studyId", member.role
		 FROM (${OWNING_STUDY[subject]}) AS owner
		 JOIN study_members AS member ON member.study_id = owner.study_id AND member.user_id = $2
		 WHERE $3::uuid IS NULL OR member.study_id = $3::uuid`,
		{ bind: [id, userId, tokenStudyId], type: QueryTypes.SELECT }
	);
	return rows[0] ?? null;
}
