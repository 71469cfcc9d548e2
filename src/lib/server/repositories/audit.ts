/** The append-only record of who did what. */
import type { Actor } from '../auth/caller';
import { AuditEventModel } from '../db/models/people';
import type { Tx } from './transaction';

export interface AuditEvent {
	/** `subject.verb`, past tense: `box.replaced`. */
	action: string;
	studyId?: string;
	/** Id of the row that it was done to. */
	subjectId?: string;
	/** What a reader of the record wants to know; never a secret. */
	detail?: Record<string, unknown>;
}

/** Records an event in the transaction that makes it true. `actor` is null for what a command or a job does by itself. */
export async function recordEvent(tx: Tx, actor: Actor | null, event: AuditEvent): Promise<void> {
	await AuditEventModel.create(
		{
			userId: actor?.userId ?? null,
			tokenId: actor?.tokenId ?? null,
			studyId: event.studyId ?? null,
			action: event.action,
			subjectId: event.subjectId ?? null,
			detail: event.detail ?? {}
		},
		{ transaction: tx }
	);
}
