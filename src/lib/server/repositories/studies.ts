/** Queries about studies, their people, objectives and operating points. */
import { QueryTypes } from 'sequelize';
import type { LengthUnit, Plane, Role } from '$lib/api/schemas/common';
import type { Rehearsal, Sense } from '$lib/api/schemas/studies';
import { database } from '../db/client';
import { UserModel } from '../db/models/people';
import { ObjectiveModel, OperatingPointModel, StudyMemberModel, StudyModel } from '../db/models/studies';
import type { Tx } from './transaction';

export type StudyRow = StudyModel;
export type ObjectiveRow = ObjectiveModel;
export type OperatingPointRow = OperatingPointModel;
export type MemberRow = StudyMemberModel & { user: UserModel };

/** A study as one of its members sees it in a list. */
export interface StudySummaryRow {
	id: string;
	name: string;
	note: string;
	lengthUnit: LengthUnit;
	referenceArea: number | null;
	density: number | null;
	speed: number | null;
	symmetry: Plane | null;
	invented: boolean;
	role: Role;
	shapeCount: number;
	createdAt: Date;
	updatedAt: Date;
}

const SUMMARY = `
	SELECT s.id, s.name, s.note, s.length_unit AS "lengthUnit", s.reference_area AS "referenceArea", s.density, s.speed,
		s.symmetry, s.invented, m.role, s.created_at AS "createdAt", s.updated_at AS "updatedAt",
		(SELECT count(*)::int FROM shapes WHERE shapes.study_id = s.id) AS "shapeCount"
	FROM studies s JOIN study_members m ON m.study_id = s.id AND m.user_id = $1`;

/** The studies that a person is a member of, the latest changed first. @param onlyId the only one to be seen, if any */
export const listStudySummaries = (userId: string, onlyId: string | null): Promise<StudySummaryRow[]> =>
	database().query<StudySummaryRow>(
		`${SUMMARY} WHERE $2::uuid IS NULL OR s.id = $2::uuid ORDER BY s.updated_at DESC, s.id`,
		{
			bind: [userId, onlyId],
			type: QueryTypes.SELECT
		}
	);

export async function findStudySummary(userId: string, id: string, tx?: Tx): Promise<StudySummaryRow | null> {
	const rows = await database().query<StudySummaryRow>(`${SUMMARY} WHERE s.id = $2`, {
		bind: [userId, id],
		type: QueryTypes.SELECT,
		transaction: tx
	});
	return rows[0] ?? null;
}

/** The study's own row. */
export const findStudyRow = (id: string, tx?: Tx): Promise<StudyRow | null> => {
	database();
	return StudyModel.findByPk(id, { transaction: tx });
};

export const lockStudyIfAny = (id: string, tx: Tx): Promise<StudyRow | null> => {
	database();
	return StudyModel.findByPk(id, { transaction: tx, lock: tx.LOCK.UPDATE });
};

/** Locks the study's row: what is numbered or unique in it is decided by one at a time. */
export const lockStudy = (id: string, tx: Tx): Promise<StudyRow> =>
	StudyModel.findByPk(id, { transaction: tx, lock: tx.LOCK.UPDATE, rejectOnEmpty: true });

export interface StudyValues {
	name: string;
	note: string;
	lengthUnit: LengthUnit;
	referenceArea: number | null;
	density: number | null;
	speed: number | null;
}

export const insertStudy = (values: StudyValues & { createdBy: string }, tx: Tx): Promise<StudyRow> => {
	database();
	return StudyModel.create(values, { transaction: tx });
};

export const changeStudy = (study: StudyRow, changes: Partial<StudyValues>, tx: Tx): Promise<StudyRow> =>
	study.update(changes, { transaction: tx });

/** Marks the study as changed just now; the caller holds its lock. */
export async function touchStudy(study: StudyRow, tx: Tx): Promise<void> {
	study.changed('updatedAt', true);
	await study.save({ transaction: tx });
}

// --- people ----------------------------------------------------------------------------------------------------------

/** Engineers first, then by name. */
export const listMembers = (studyId: string, tx?: Tx): Promise<MemberRow[]> =>
	StudyMemberModel.findAll({
		where: { studyId },
		include: { model: UserModel, as: 'user', required: true },
		order: [
			['role', 'ASC'],
			['user', 'name', 'ASC']
		],
		transaction: tx
	}) as Promise<MemberRow[]>;

export async function putMember(studyId: string, userId: string, role: Role, tx: Tx): Promise<void> {
	await database().query(
		`INSERT INTO study_members (study_id, user_id, role) VALUES ($1, $2, $3)
		 ON CONFLICT (study_id, user_id) DO UPDATE SET role = excluded.role`,
		{ bind: [studyId, userId, role], transaction: tx }
	);
}

export async function deleteMember(studyId: string, userId: string, tx: Tx): Promise<void> {
	await StudyMemberModel.destroy({ where: { studyId, userId }, transaction: tx });
}

// --- objectives and operating points ---------------------------------------------------------------------------------

export const listObjectives = (studyId: string, tx?: Tx): Promise<ObjectiveRow[]> =>
	ObjectiveModel.findAll({ where: { studyId }, order: ['position'], transaction: tx });

export const insertObjective = (
	values: {
		studyId: string;
		position: number;
		name: string;
		unit: string;
		sense: Sense;
		weight: number;
		rehearsal: Rehearsal | null;
	},
	tx: Tx
): Promise<ObjectiveRow> => ObjectiveModel.create(values, { transaction: tx });

export const changeObjective = (
	objective: ObjectiveRow,
	changes: { name?: string; sense?: Sense; weight?: number },
	tx: Tx
): Promise<ObjectiveRow> => objective.update(changes, { transaction: tx });

export const listOperatingPoints = (studyId: string, tx?: Tx): Promise<OperatingPointRow[]> =>
	OperatingPointModel.findAll({ where: { studyId }, order: ['position'], transaction: tx });

export const insertOperatingPoint = (
	values: {
		studyId: string;
		position: number;
		name: string;
		speed: number | null;
		density: number | null;
		yaw: number | null;
		weight: number;
	},
	tx: Tx
): Promise<OperatingPointRow> => {
	database();
	return OperatingPointModel.create(values, { transaction: tx });
};
