/** Who takes part in a study. */
import { id as uuid, type Role } from '$lib/api/schemas/common';
import { type Member } from '$lib/api/schemas/people';
import type { StudyAccess } from '../auth/caller';
import { AppError } from '../errors';
import { recordEvent } from '../repositories/audit';
import * as repository from '../repositories/studies';
import { inTransaction, type Tx } from '../repositories/transaction';
import { findUserByEmail } from '../repositories/users';

function memberAnswer({ user, role }: repository.MemberRow): Member {
	return { userId: user.id, name: user.name, email: user.email, role };
}

const members = async (studyId: string, tx?: Tx): Promise<Member[]> =>
	(await repository.listMembers(studyId, tx)).map(memberAnswer);

export const listMembers = ({ studyId }: StudyAccess): Promise<Member[]> => members(studyId);

/** A study without an engineer could not be changed any more, not even by adding one. The caller holds the study's lock. */
async function refuseLosingLastEngineer(studyId: string, userId: string, tx: Tx): Promise<void> {
	const engineers = (await repository.listMembers(studyId, tx)).filter(({ role }) => role === 'engineer');
	if (!engineers.some((member) => member.userId === userId)) return;
	if (engineers.some((member) => member.userId !== userId && member.user.active)) return;
	throw new AppError('conflict', 'This is the study’s last engineer.', {
		mend: 'Make somebody else an engineer first.'
	});
}

/** Adds a person, or changes the role of one who is there. */
export async function putMember(access: StudyAccess, email: string, role: Role): Promise<Member[]> {
	const { studyId } = access;
	return inTransaction(async (tx) => {
		const study = await repository.lockStudy(studyId, tx);
		const user = await findUserByEmail(email, tx);
		if (!user || !user.active) {
			throw new AppError('invalid', `Nobody with the e-mail ${email} can sign in to this installation.`, {
				mend: 'An admin adds people to the installation; then they can take part in a study.',
				errors: [{ pointer: '/email', detail: 'nobody here who can sign in has this e-mail' }]
			});
		}
		if (role !== 'engineer') await refuseLosingLastEngineer(studyId, user.id, tx);
		await repository.putMember(studyId, user.id, role, tx);
		await repository.touchStudy(study, tx);
		await recordEvent(tx, access, { action: 'member.put', studyId, subjectId: user.id, detail: { role } });
		return members(studyId, tx);
	});
}

export async function removeMember(access: StudyAccess, userId: string): Promise<Member[]> {
	const { studyId } = access;
	return inTransaction(async (tx) => {
		const study = await repository.lockStudy(studyId, tx);
		const present = await repository.listMembers(studyId, tx);
		if (!present.some((member) => member.userId === userId)) {
			throw new AppError('not-found', 'This person takes no part in the study.');
		}
		await refuseLosingLastEngineer(studyId, userId, tx);
		await repository.deleteMember(studyId, userId, tx);
		await repository.touchStudy(study, tx);
		await recordEvent(tx, access, { action: 'member.removed', studyId, subjectId: userId });
		return members(studyId, tx);
	});
}

/** For the command line: puts a person into a study that may have nobody left who could. */
export async function placeMember(studyId: string, userId: string, role: Role): Promise<void> {
	await inTransaction(async (tx) => {
		const study = uuid.safeParse(studyId).success ? await repository.lockStudyIfAny(studyId, tx) : null;
		if (!study) throw new AppError('not-found', `There is no study ${studyId}.`);
		if (role !== 'engineer') await refuseLosingLastEngineer(studyId, userId, tx);
		await repository.putMember(studyId, userId, role, tx);
		await recordEvent(tx, null, { action: 'member.put', studyId, subjectId: userId, detail: { role } });
	});
}
