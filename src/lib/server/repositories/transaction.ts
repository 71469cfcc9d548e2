/** Transactions for services, which do not know Sequelize. */
import type { Transaction } from 'sequelize';
import { database } from '../db/client';

export type Tx = Transaction;

/** Runs the work in one transaction (read committed): all of it is stored, or nothing. */
export function inTransaction<T>(work: (tx: Tx) => Promise<T>): Promise<T> {
	return database().transaction(work);
}
