/** API tokens: a program acts as the person who made its token, in all their studies or in one. */
import { id as uuid } from '$lib/api/schemas/common';
import { type Token } from '$lib/api/schemas/people';
import { newToken } from '../auth/bearer';
import type { Actor, Caller } from '../auth/caller';
import { AppError } from '../errors';
import { findStudyAccess } from '../repositories/access';
import { recordEvent } from '../repositories/audit';
import * as repository from '../repositories/tokens';
import { inTransaction } from '../repositories/transaction';
import { findUserByEmail } from '../repositories/users';

function tokenAnswer(row: repository.TokenRow): Token {
	return {
		id: row.id,
		name: row.name,
		prefix: row.prefix,
		studyId: row.studyId,
		owner: { id: row.user.id, name: row.user.name },
		createdAt: row.createdAt.toISOString(),
		lastUsedAt: row.lastUsedAt?.toISOString() ?? null,
		revokedAt: row.revokedAt?.toISOString() ?? null
	};
}

/** Else a program that was given one study could give itself the others. */
function refuseBoundToken({ tokenStudyId }: Caller): void {
	if (!tokenStudyId) return;
	throw new AppError('forbidden', 'A token that is bound to a study can’t handle tokens.', {
		mend: 'Sign in, or use a token that is not bound to a study.'
	});
}

/** One's own; everyone's for an admin. */
export async function listTokens(caller: Caller): Promise<Token[]> {
	refuseBoundToken(caller);
	return (await repository.listTokens(caller.isAdmin ? null : caller.userId)).map(tokenAnswer);
}

async function issue(owner: Actor, name: string, studyId: string | null): Promise<Token & { token: string }> {
	const { token, prefix, hash } = newToken();
	return inTransaction(async (tx) => {
		const row = await repository.insertToken({ userId: owner.userId, studyId, name, prefix, hash }, tx);
		const detail = { name, prefix };
		await recordEvent(tx, owner, {
			action: 'token.created',
			subjectId: row.id,
			studyId: studyId ?? undefined,
			detail
		});
		return { ...tokenAnswer(row), token };
	});
}

export async function createToken(
	caller: Caller,
	{ name, studyId = null }: { name: string; studyId?: string | null }
): Promise<Token & { token: string }> {
	refuseBoundToken(caller);
	if (studyId && !(uuid.safeParse(studyId).success && (await findStudyAccess('study', studyId, caller)))) {
		throw new AppError('invalid', 'There is no such study, or you have no part in it.', {
			errors: [{ pointer: '/studyId', detail: 'not a study of yours' }]
		});
	}
	return issue(caller, name, studyId);
}

/** One's own, or anybody's for an admin. Revoking again changes nothing. */
export async function revokeToken(caller: Caller, id: string): Promise<Token> {
	refuseBoundToken(caller);
	return inTransaction(async (tx) => {
		const changed = await repository.revokeToken(id, caller.isAdmin ? null : caller.userId, tx);
		if (!changed) throw new AppError('not-found', 'There is no such token, or it is not yours.');
		if (changed.revokedNow) await recordEvent(tx, caller, { action: 'token.revoked', subjectId: id });
		return tokenAnswer(changed.row);
	});
}

/** For the command line: a token of the person with this e-mail. */
export async function createTokenFor(email: string, name: string, studyId: string | null) {
	const user = await findUserByEmail(email);
	if (!user) throw new AppError('not-found', `Nobody here has the e-mail ${email}.`);
	if (!user.active) throw new AppError('conflict', `${email} may not sign in, so a token would not work.`);
	return createToken({ userId: user.id, tokenId: null, isAdmin: user.isAdmin, tokenStudyId: null }, { name, studyId });
}
