/** Studies, their objectives and operating points. */
import type { z } from 'zod';
import type * as wire from '$lib/api/schemas/studies';
import type { Caller, StudyAccess } from '../auth/caller';
import { AppError } from '../errors';
import { recordEvent } from '../repositories/audit';
import { boxes, keepOuts, locks } from '../repositories/drawn';
import * as repository from '../repositories/studies';
import { inTransaction, type Tx } from '../repositories/transaction';
import { boxAnswer } from './boxes';
import { keepOutAnswer } from './keep-outs';
import { lockAnswer } from './locks';

/** Areas and drag areas in m², volumes in m³. */
const REHEARSAL_UNITS: Record<wire.Rehearsal['kind'], string> = {
	wettedArea: 'm²',
	volume: 'm³',
	frontalArea: 'm²',
	impactDrag: 'm²'
};

const FIRST_OPERATING_POINT = 'Design point';

function summaryAnswer(row: repository.StudySummaryRow): wire.StudySummary {
	return {
		id: row.id,
		name: row.name,
		note: row.note,
		lengthUnit: row.lengthUnit,
		role: row.role,
		shapeCount: row.shapeCount,
		invented: row.invented,
		createdAt: row.createdAt.toISOString(),
		updatedAt: row.updatedAt.toISOString()
	};
}

function objectiveAnswer(row: repository.ObjectiveRow): wire.Objective {
	const { id, name, unit, sense, weight, position, rehearsal } = row;
	return { id, name, unit, sense, weight, position, rehearsal: rehearsal ?? null };
}

function operatingPointAnswer(row: repository.OperatingPointRow): wire.OperatingPoint {
	const { id, name, speed, density, yaw, weight } = row;
	return { id, name, speed: speed ?? null, density: density ?? null, yaw: yaw ?? null, weight };
}

async function readStudy({ studyId, userId }: StudyAccess, tx?: Tx): Promise<wire.Study> {
	const row = await repository.findStudySummary(userId, studyId, tx);
	if (!row) throw new AppError('not-found', 'There is no such study, or you have no part in it.');
	const { referenceArea, density, speed, symmetry } = row;
	return {
		...summaryAnswer(row),
		referenceArea,
		density,
		speed,
		objectives: (await repository.listObjectives(studyId, tx)).map(objectiveAnswer),
		operatingPoints: (await repository.listOperatingPoints(studyId, tx)).map(operatingPointAnswer),
		symmetry,
		boxes: (await boxes.list(studyId, tx)).map(boxAnswer),
		keepOuts: (await keepOuts.list(studyId, tx)).map(keepOutAnswer),
		locks: (await locks.list(studyId, tx)).map(lockAnswer)
	};
}

/** The studies that the caller is a member of; a token that is bound to a study sees that one. */
export async function listStudies({ userId, tokenStudyId }: Caller): Promise<wire.StudySummary[]> {
	return (await repository.listStudySummaries(userId, tokenStudyId)).map(summaryAnswer);
}

/** Makes a study with its maker as engineer and a first operating point of the study's speed and density. */
export async function createStudy(caller: Caller, body: z.output<typeof wire.studyCreate>): Promise<wire.Study> {
	if (caller.tokenStudyId) {
		throw new AppError('forbidden', 'This token is bound to one study and can’t make others.', {
			mend: 'Use a token that is not bound to a study.'
		});
	}
	const { userId, tokenId } = caller;
	const { name, lengthUnit, note = '', referenceArea = null, density = null, speed = null } = body;
	return inTransaction(async (tx) => {
		const values = { name, lengthUnit, note, referenceArea, density, speed, createdBy: userId };
		const { id: studyId } = await repository.insertStudy(values, tx);
		await repository.putMember(studyId, userId, 'engineer', tx);
		await repository.insertOperatingPoint(
			{ studyId, position: 0, name: FIRST_OPERATING_POINT, speed, density, yaw: null, weight: 1 },
			tx
		);
		await recordEvent(tx, caller, { action: 'study.created', studyId, subjectId: studyId, detail: { name } });
		return readStudy({ studyId, userId, tokenId, role: 'engineer' }, tx);
	});
}

export const getStudy = (access: StudyAccess): Promise<wire.Study> => readStudy(access);

export async function updateStudy(access: StudyAccess, body: z.output<typeof wire.studyUpdate>): Promise<wire.Study> {
	const { studyId } = access;
	return inTransaction(async (tx) => {
		await repository.changeStudy(await repository.lockStudy(studyId, tx), body, tx);
		await recordEvent(tx, access, { action: 'study.changed', studyId, subjectId: studyId, detail: body });
		return readStudy(access, tx);
	});
}

/** A name that is free among the study's objectives or operating points, whose lock the caller holds. */
function refuseTaken(name: string | undefined, others: { name: string }[], what: string) {
	if (!others.some((other) => other.name === name)) return;
	throw new AppError('conflict', `The study already has an ${what} named “${name}”.`, {
		mend: 'Choose another name.',
		errors: [{ pointer: '/name', detail: 'already taken in this study' }]
	});
}

const nextPosition = (rows: { position: number }[]) => Math.max(-1, ...rows.map(({ position }) => position)) + 1;

export async function createObjective(
	access: StudyAccess,
	body: z.output<typeof wire.objectiveCreate>
): Promise<wire.Objective> {
	const { studyId } = access;
	const { name, sense, weight, rehearsal } = body;
	const unit = rehearsal ? REHEARSAL_UNITS[rehearsal.kind] : body.unit;
	return inTransaction(async (tx) => {
		const study = await repository.lockStudy(studyId, tx);
		const others = await repository.listObjectives(studyId, tx);
		refuseTaken(name, others, 'objective');
		const position = nextPosition(others);
		const row = await repository.insertObjective({ studyId, position, name, unit, sense, weight, rehearsal }, tx);
		await repository.touchStudy(study, tx);
		await recordEvent(tx, access, { action: 'objective.created', studyId, subjectId: row.id, detail: body });
		return objectiveAnswer(row);
	});
}

export async function updateObjective(
	access: StudyAccess,
	id: string,
	body: z.output<typeof wire.objectiveUpdate>
): Promise<wire.Objective> {
	const { studyId } = access;
	return inTransaction(async (tx) => {
		const study = await repository.lockStudy(studyId, tx);
		const all = await repository.listObjectives(studyId, tx);
		const objective = all.find((row) => row.id === id);
		if (!objective) throw new AppError('not-found', 'There is no such objective, or you have no part in its study.');
		refuseTaken(
			body.name,
			all.filter((row) => row !== objective),
			'objective'
		);
		const before = objectiveAnswer(objective);
		const row = await repository.changeObjective(objective, body, tx);
		await repository.touchStudy(study, tx);
		const detail = { before, changes: body };
		await recordEvent(tx, access, { action: 'objective.changed', studyId, subjectId: id, detail });
		return objectiveAnswer(row);
	});
}

export async function createOperatingPoint(
	access: StudyAccess,
	body: z.output<typeof wire.operatingPointCreate>
): Promise<wire.OperatingPoint> {
	const { studyId } = access;
	const { name, speed = null, density = null, yaw = null, weight } = body;
	return inTransaction(async (tx) => {
		const study = await repository.lockStudy(studyId, tx);
		const others = await repository.listOperatingPoints(studyId, tx);
		refuseTaken(name, others, 'operating point');
		const values = { studyId, position: nextPosition(others), name, speed, density, yaw, weight };
		const row = await repository.insertOperatingPoint(values, tx);
		await repository.touchStudy(study, tx);
		await recordEvent(tx, access, { action: 'operating-point.created', studyId, subjectId: row.id, detail: body });
		return operatingPointAnswer(row);
	});
}
