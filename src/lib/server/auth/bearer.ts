/** API tokens: `planish_` and 32 random bytes in base64url; only the SHA-256 is kept, which suffices for random secrets. */
import { createHash, randomBytes } from 'node:crypto';

export const TOKEN_MARK = 'planish_';
/** How much of a token is kept in the clear, to tell tokens apart. */
const PREFIX_LENGTH = TOKEN_MARK.length + 4;

export const hashToken = (token: string): Buffer => createHash('sha256').update(token).digest();

export function newToken(): { token: string; prefix: string; hash: Buffer } {
	const token = TOKEN_MARK + randomBytes(32).toString('base64url');
	return { token, prefix: token.slice(0, PREFIX_LENGTH), hash: hashToken(token) };
}

/**
 * The token of an Authorization header.
 *
 * @returns null without one (other schemes are a proxy's business); '' for a Bearer header that holds none
 */
export function bearerOf(authorization: string | null): string | null {
	const match = /^Bearer(?: +(.*))?$/i.exec(authorization?.trim() ?? '');
	return match && (match[1] ?? '');
}
