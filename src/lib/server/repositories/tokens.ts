/** Queries about API tokens. Only a token's SHA-256 is kept. */
import { database } from '../db/client';
import { ApiTokenModel, UserModel } from '../db/models/people';
import type { Tx } from './transaction';

/** A token with its owner. */
export type TokenRow = ApiTokenModel & { user: UserModel };

const tokens = () => {
	database();
	return ApiTokenModel;
};
const withOwner = { model: UserModel, as: 'user', required: true };

/** The token that is neither revoked nor its owner's who may not sign in. */
export const findLiveToken = (hash: Buffer): Promise<TokenRow | null> =>
	tokens().findOne({
		where: { hash, revokedAt: null },
		include: { ...withOwner, where: { active: true } }
	}) as Promise<TokenRow | null>;

/** Notes the use, at most once a minute. */
export async function touchToken(token: TokenRow, now = new Date()): Promise<void> {
	if (token.lastUsedAt && now.getTime() - token.lastUsedAt.getTime() < 60_000) return;
	await tokens().update({ lastUsedAt: now }, { where: { id: token.id } });
}

/** Newest first. @param userId whose; null for everyone's */
export const listTokens = (userId: string | null): Promise<TokenRow[]> =>
	tokens().findAll({
		where: userId ? { userId } : {},
		include: withOwner,
		order: [['createdAt', 'DESC']]
	}) as Promise<TokenRow[]>;

export async function insertToken(
	values: { userId: string; studyId: string | null; name: string; prefix: string; hash: Buffer },
	tx: Tx
): Promise<TokenRow> {
	const { id } = await tokens().create(values, { transaction: tx });
	return (await tokens().findByPk(id, { include: withOwner, transaction: tx })) as TokenRow;
}

/** Revokes it if it is the person's own (or anybody's, for null). Revoking again keeps the first time. */
export async function revokeToken(
	id: string,
	userId: string | null,
	tx: Tx
): Promise<{ row: TokenRow; revokedNow: boolean } | null> {
	const where = userId ? { id, userId } : { id };
	const [count] = await tokens().update(
		{ revokedAt: new Date() },
		{ where: { ...where, revokedAt: null }, transaction: tx }
	);
	const row = (await tokens().findOne({ where, include: withOwner, transaction: tx })) as TokenRow | null;
	return row && { row, revokedNow: count > 0 };
}
