/** Design boxes: every edit is a new version, and putting one away keeps them all. */
import type { Box, BoxCreate } from '$lib/api/schemas';
import type { StudyAccess } from '../auth/caller';
import { AppError } from '../errors';
import { recordEvent } from '../repositories/audit';
import * as repository from '../repositories/boxes';
import { lockStudy, touchStudy } from '../repositories/studies';
import { inTransaction, type Tx } from '../repositories/transaction';

export function boxAnswer(row: repository.BoxRow): Box {
	const { name, centre, halfSize, rotation, lattice, basis, degree, held, axes, frame } = row.definition;
	return {
		id: row.id,
		studyId: row.studyId,
		version: row.version,
		name,
		centre,
		halfSize,
		rotation,
		lattice,
		basis,
		...(degree !== undefined && { degree }),
		held,
		axes,
		frame,
		updatedAt: row.updatedAt.toISOString()
	};
}

async function lockBox({ studyId }: StudyAccess, id: string, tx: Tx): Promise<repository.BoxRow> {
	const box = await repository.lockBox(studyId, id, tx);
	if (!box) throw new AppError('not-found', 'There is no such design box, or you have no part in its study.');
	return box;
}

export async function createBox(access: StudyAccess, definition: BoxCreate): Promise<Box> {
	const { studyId, userId } = access;
	return inTransaction(async (tx) => {
		const study = await lockStudy(studyId, tx);
		const boxId = await repository.insertBox(studyId, tx);
		await repository.insertBoxVersion({ boxId, version: 1, definition, createdBy: userId }, tx);
		await touchStudy(study, tx);
		const detail = { name: definition.name };
		await recordEvent(tx, access, { action: 'box.created', studyId, subjectId: boxId, detail });
		return boxAnswer(await lockBox(access, boxId, tx));
	});
}

/** @throws AppError conflict when the box is put away */
export async function replaceBox(access: StudyAccess, id: string, definition: BoxCreate): Promise<Box> {
	const { studyId, userId } = access;
	return inTransaction(async (tx) => {
		const study = await lockStudy(studyId, tx);
		const { archivedAt, version } = await lockBox(access, id, tx);
		if (archivedAt) {
			throw new AppError('conflict', 'The design box was put away.', { mend: 'Bring it back first, then change it.' });
		}
		await repository.insertBoxVersion({ boxId: id, version: version + 1, definition, createdBy: userId }, tx);
		await touchStudy(study, tx);
		const detail = { name: definition.name, version: version + 1 };
		await recordEvent(tx, access, { action: 'box.replaced', studyId, subjectId: id, detail });
		return boxAnswer(await lockBox(access, id, tx));
	});
}

async function setArchived(access: StudyAccess, id: string, away: boolean): Promise<Box> {
	const { studyId } = access;
	return inTransaction(async (tx) => {
		const study = await lockStudy(studyId, tx);
		const box = await lockBox(access, id, tx);
		// Doing it twice is doing it once, and is recorded once.
		if (Boolean(box.archivedAt) !== away) {
			await repository.setBoxArchived(id, away ? new Date() : null, tx);
			await touchStudy(study, tx);
			const detail = { name: box.definition.name };
			await recordEvent(tx, access, { action: away ? 'box.removed' : 'box.restored', studyId, subjectId: id, detail });
		}
		return boxAnswer(box);
	});
}

export const removeBox = (access: StudyAccess, id: string): Promise<Box> => setArchived(access, id, true);
export const restoreBox = (access: StudyAccess, id: string): Promise<Box> => setArchived(access, id, false);
