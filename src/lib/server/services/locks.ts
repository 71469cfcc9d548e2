/** Locks: patches and painted triangles that a move leaves alone. */
import type { Lock, LockCreate } from '$lib/api/schemas/drawn';
import { locks, type DrawnRow } from '../repositories/drawn';
import { DrawnService } from './drawn';

export function lockAnswer(row: DrawnRow<LockCreate>): Lock {
	const { name, patches, painted, blend } = row.definition;
	return {
		id: row.id,
		studyId: row.studyId,
		version: row.version,
		name,
		patches,
		painted,
		blend,
		updatedAt: row.updatedAt.toISOString()
	};
}

export const lockService = new DrawnService(locks, 'lock', 'lock', lockAnswer);
