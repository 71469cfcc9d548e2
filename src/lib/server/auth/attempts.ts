/** Slows down guessing of passwords: counts failed sign-ins by e-mail and address, and by address alone. */
import { RateLimiterMemory, RateLimiterRes } from 'rate-limiter-flexible';
import { AppError } from '../errors';

const WINDOW_SECONDS = 15 * 60;
const FOR_ONE_PERSON = 10;
const FROM_ONE_ADDRESS = 100;

/** State of the process on purpose: a restart forgives, and no other process signs people in. */
export class SignInAttempts {
	#byPerson = new RateLimiterMemory({ points: FOR_ONE_PERSON, duration: WINDOW_SECONDS, keyPrefix: 'person' });
	#byAddress = new RateLimiterMemory({ points: FROM_ONE_ADDRESS, duration: WINDOW_SECONDS, keyPrefix: 'address' });

	/**
	 * Counts an attempt before its password is looked at, so that many at once do not slip through.
	 *
	 * @throws AppError too-many-requests
	 */
	async begin(email: string, address: string): Promise<void> {
		try {
			await this.#byAddress.consume(address);
			await this.#byPerson.consume(`${email.toLowerCase()} ${address}`);
		} catch (thrown) {
			if (!(thrown instanceof RateLimiterRes)) throw thrown;
			const seconds = Math.ceil(thrown.msBeforeNext / 1000);
			throw new AppError('too-many-requests', `Too many failed sign-ins. Try again in ${words(seconds)}.`, {
				retryAfter: seconds
			});
		}
	}

	/** Takes the attempt back: only failures count. */
	async succeed(email: string, address: string): Promise<void> {
		await this.#byPerson.delete(`${email.toLowerCase()} ${address}`);
		await this.#byAddress.reward(address);
	}
}

const words = (seconds: number) => {
	const minutes = Math.ceil(seconds / 60);
	return minutes === 1 ? 'a minute' : `${minutes} minutes`;
};
