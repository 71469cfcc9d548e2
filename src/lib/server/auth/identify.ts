/** Finds out who calls: an API token if one is sent, else the session. Both are looked up in the database each time. */
import { AppError } from '../errors';
import { findLiveToken, touchToken } from '../repositories/tokens';
import { findSessionUser, type UserRow } from '../repositories/users';
import { hashToken } from './bearer';
import type { Caller, SignedInUser } from './caller';

export interface Identity {
	user: SignedInUser;
	caller: Caller;
}

/** What a session cookie claims, its signature already checked. */
export interface SessionClaim {
	userId: string;
	sessionEpoch: number;
}

function identity(user: UserRow, token: { id: string; studyId: string | null } | null): Identity {
	const { id, email, name, isAdmin } = user;
	return {
		user: { id, email, name, isAdmin },
		caller: { userId: id, isAdmin, tokenId: token?.id ?? null, tokenStudyId: token?.studyId ?? null }
	};
}

/** @throws AppError unauthenticated: a token that does not hold is never replaced by a session in silence */
export async function identifyToken(token: string): Promise<Identity> {
	const found = token ? await findLiveToken(hashToken(token)) : null;
	if (!found) {
		throw new AppError('unauthenticated', 'The API token is unknown or was revoked, or its owner may not sign in.', {
			mend: 'Make a new token in Planish or with npm run token.'
		});
	}
	await touchToken(found);
	return identity(found.user, found);
}

/** @returns null when the session was ended: the person was deactivated or has a new password */
export async function identifySession({ userId, sessionEpoch }: SessionClaim): Promise<Identity | null> {
	const user = await findSessionUser(userId, sessionEpoch);
	return user && identity(user, null);
}
