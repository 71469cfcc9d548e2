/** Queries about people. */
import { UniqueConstraintError } from 'sequelize';
import { database } from '../db/client';
import { UserModel } from '../db/models/people';
import type { Tx } from './transaction';

export type UserRow = UserModel;

export interface UserChanges {
	name?: string;
	passwordHash?: string;
	isAdmin?: boolean;
	active?: boolean;
	sessionEpoch?: number;
}

/** Binds the models before a class method is used: a process may not have touched the database yet. */
const users = () => {
	database();
	return UserModel;
};

export const listUsers = (): Promise<UserRow[]> => users().findAll({ order: ['name', 'email'] });

/** By e-mail, in any case of letters; also people who may not sign in. */
export const findUserByEmail = (email: string, tx?: Tx): Promise<UserRow | null> =>
	users().findOne({ where: { email: email.trim().toLowerCase() }, transaction: tx });

/** The person of a session, unless it was ended (deactivation or a new password since). */
export const findSessionUser = (id: string, sessionEpoch: number): Promise<UserRow | null> =>
	users().findOne({ where: { id, sessionEpoch, active: true } });

/** Locks the row until the transaction ends. */
export const lockUser = (id: string, tx: Tx): Promise<UserRow | null> =>
	users().findByPk(id, { transaction: tx, lock: tx.LOCK.UPDATE });

/** Locks every active admin's row, so that two admins can't take the right from each other at once. */
export const lockActiveAdmins = (tx: Tx): Promise<UserRow[]> =>
	users().findAll({ where: { isAdmin: true, active: true }, order: ['id'], transaction: tx, lock: tx.LOCK.UPDATE });

/** @returns null when the e-mail is taken, which ends the transaction's use */
export async function insertUser(
	values: { email: string; name: string; passwordHash: string; isAdmin: boolean },
	tx: Tx
): Promise<UserRow | null> {
	try {
		return await users().create(values, { transaction: tx });
	} catch (thrown) {
		if (thrown instanceof UniqueConstraintError) return null;
		throw thrown;
	}
}

export const changeUser = (user: UserRow, changes: UserChanges, tx: Tx): Promise<UserRow> =>
	user.update(changes, { transaction: tx });
