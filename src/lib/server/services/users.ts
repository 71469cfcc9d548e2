/** The people of the installation; only its admins come here. */
import type { z } from 'zod';
import type * as wire from '$lib/api/schemas/people';
import type { Actor } from '../auth/caller';
import { hashPassword } from '../auth/password';
import { AppError } from '../errors';
import { recordEvent } from '../repositories/audit';
import { inTransaction, type Tx } from '../repositories/transaction';
import * as repository from '../repositories/users';

function userAnswer(row: repository.UserRow): wire.User {
	const { id, email, name, isAdmin, active } = row;
	return { id, email, name, isAdmin, active, createdAt: row.createdAt.toISOString() };
}

export const listUsers = async (): Promise<wire.User[]> => (await repository.listUsers()).map(userAnswer);

/** @param actor null when the command line makes the person */
export async function createUser(actor: Actor | null, body: z.output<typeof wire.userCreate>): Promise<wire.User> {
	const { email, name, password, isAdmin } = body;
	const passwordHash = await hashPassword(password);
	return inTransaction(async (tx) => {
		const row = await repository.insertUser({ email, name, passwordHash, isAdmin }, tx);
		if (!row) {
			throw new AppError('conflict', `Somebody with the e-mail ${email} is already here.`, {
				mend: 'Change that person instead.',
				errors: [{ pointer: '/email', detail: 'already taken' }]
			});
		}
		await recordEvent(tx, actor, { action: 'user.created', subjectId: row.id, detail: { email, name, isAdmin } });
		return userAnswer(row);
	});
}

/** An installation without an admin could not get one back through its own pages. */
async function refuseLosingLastAdmin(id: string, tx: Tx): Promise<void> {
	const admins = await repository.lockActiveAdmins(tx);
	if (admins.length !== 1 || admins[0].id !== id) return;
	throw new AppError('conflict', 'This is the last admin who can sign in.', {
		mend: 'Make somebody else an admin first.'
	});
}

/** A new password, and being barred, end the person's sessions at once. */
export async function updateUser(
	actor: Actor | null,
	id: string,
	body: z.output<typeof wire.userUpdate>
): Promise<wire.User> {
	const { name, isAdmin, active, password } = body;
	const passwordHash = password === undefined ? undefined : await hashPassword(password);
	return inTransaction(async (tx) => {
		if (isAdmin === false || active === false) await refuseLosingLastAdmin(id, tx);
		const row = await repository.lockUser(id, tx);
		if (!row) throw new AppError('not-found', 'There is no such person.');
		const endsSessions = passwordHash !== undefined || (active === false && row.active);
		const sessionEpoch = row.sessionEpoch + (endsSessions ? 1 : 0);
		await repository.changeUser(row, { name, isAdmin, active, passwordHash, sessionEpoch }, tx);
		const detail = { name, isAdmin, active, ...(passwordHash && { password: 'new' }) };
		await recordEvent(tx, actor, { action: 'user.changed', subjectId: id, detail });
		return userAnswer(row);
	});
}

export interface PersonToPut {
	email: string;
	name?: string;
	isAdmin?: boolean;
	password?: string;
	/** For a person who is new, when no password is given. */
	firstPassword: string;
}

/** For the command line: makes the person, or changes what is given of one who is here and lets them sign in again. */
export async function putPerson(person: PersonToPut): Promise<{ created: boolean; user: wire.User }> {
	const { email, name, isAdmin, password, firstPassword } = person;
	const present = await repository.findUserByEmail(email);
	if (present)
		return { created: false, user: await updateUser(null, present.id, { name, isAdmin, password, active: true }) };
	const values = { email, name: name ?? email, password: password ?? firstPassword, isAdmin: isAdmin ?? false };
	return { created: true, user: await createUser(null, values) };
}
