/** The rule of signing in with a password. */
import { findUserByEmail } from '../repositories/users';
import type { SignInAttempts } from './attempts';
import { verifyPassword } from './password';

/** Longer ones are refused before they are hashed. */
const LONGEST = 200;

export interface Credentials {
	email: string;
	password: string;
	/** Where the attempt comes from. */
	address: string;
}

/**
 * @returns the person, or null: unknown, wrong password, or not allowed to sign in, and the caller is not told which
 * @throws AppError too-many-requests
 */
export async function checkCredentials(attempts: SignInAttempts, { email, password, address }: Credentials) {
	await attempts.begin(email, address);
	const user = email.length <= 254 ? await findUserByEmail(email) : null;
	const right = await verifyPassword(user?.passwordHash ?? null, password.slice(0, LONGEST + 1));
	if (!user || !user.active || !right || password.length > LONGEST) return null;
	await attempts.succeed(email, address);
	return { id: user.id, email: user.email, name: user.name, sessionEpoch: user.sessionEpoch };
}
