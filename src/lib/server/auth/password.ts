/** Passwords: Argon2id (RFC 9106) with the package's defaults, 19 MiB and two passes, the OWASP cheat sheet's minimum. */
import { hash, verify } from '@node-rs/argon2';

/** Of a password that nobody has: verified against when the e-mail is unknown, so that both answers take as long. */
let decoy: Promise<string> | undefined;

export const hashPassword = (password: string): Promise<string> => hash(password);

/**
 * @param passwordHash null when there is no such person; the work is done all the same
 */
export async function verifyPassword(passwordHash: string | null, password: string): Promise<boolean> {
	decoy ??= hash('nobody has this password');
	const right = await verify(passwordHash ?? (await decoy), password);
	return passwordHash !== null && right;
}
