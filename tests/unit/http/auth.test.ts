import { describe, expect, it } from 'vitest';
import { SignInAttempts } from '$lib/server/auth/attempts';
import { bearerOf, hashToken, newToken } from '$lib/server/auth/bearer';
import { isForged, type Sender } from '$lib/server/auth/csrf';
import { hashPassword, verifyPassword } from '$lib/server/auth/password';

describe('isForged', () => {
	const form: Sender = {
		method: 'POST',
		origin: 'http://127.0.0.1:3000',
		host: '127.0.0.1:3000',
		siteOrigin: 'http://127.0.0.1:3000',
		bearer: false,
		canAct: true
	};

	it('lets a page of this site act', () => expect(isForged(form)).toBe(false));

	it.each(['POST', 'PUT', 'PATCH', 'DELETE'])('refuses %s from another site', (method) => {
		expect(isForged({ ...form, method, origin: 'https://elsewhere.example' })).toBe(true);
	});

	it('tells ports, sub-domains and look-alikes apart', () => {
		expect(isForged({ ...form, origin: 'http://127.0.0.1:3001' })).toBe(true);
		expect(isForged({ ...form, origin: 'http://127.0.0.1' })).toBe(true);
		expect(isForged({ ...form, origin: 'http://127.0.0.1:3000.elsewhere.example' })).toBe(true);
		expect(isForged({ ...form, origin: 'http://elsewhere.example/?127.0.0.1:3000' })).toBe(true);
	});

	it('refuses a sender that hides where it comes from', () => {
		expect(isForged({ ...form, origin: null })).toBe(true);
		expect(isForged({ ...form, origin: 'null' })).toBe(true);
		expect(isForged({ ...form, origin: '' })).toBe(true);
	});

	it('takes the name by which the person opened the site', () => {
		expect(isForged({ ...form, origin: 'http://localhost:3000', host: 'localhost:3000' })).toBe(false);
	});

	it('takes the public origin behind a proxy that rewrites Host', () => {
		const proxied = { ...form, host: 'app:3000', siteOrigin: 'https://planish.example' };
		expect(isForged({ ...proxied, origin: 'https://planish.example' })).toBe(false);
		expect(isForged({ ...proxied, origin: 'http://planish.example' })).toBe(true);
	});

	it('leaves reading, tokens, and calls without a session alone', () => {
		const away = { ...form, origin: 'https://elsewhere.example' };
		expect(isForged({ ...away, method: 'GET' })).toBe(false);
		expect(isForged({ ...away, bearer: true })).toBe(false);
		expect(isForged({ ...away, canAct: false })).toBe(false);
	});
});

describe('bearerOf', () => {
	it('reads the token whatever the letters of the scheme', () => {
		expect(bearerOf('Bearer planish_abc')).toBe('planish_abc');
		expect(bearerOf('bearer   planish_abc ')).toBe('planish_abc');
	});
	it('does not take an empty one for none', () => {
		expect(bearerOf('Bearer')).toBe('');
		expect(bearerOf('Bearer ')).toBe('');
	});
	it('leaves other schemes to proxies', () => {
		expect(bearerOf(null)).toBeNull();
		expect(bearerOf('Basic YTpi')).toBeNull();
		expect(bearerOf('Bearerplanish_abc')).toBeNull();
	});
});

describe('newToken', () => {
	it('makes tokens that are known by their hash', () => {
		const [one, two] = [newToken(), newToken()];
		expect(one.token).toMatch(/^planish_[\w-]{43}$/);
		expect(one.token).not.toBe(two.token);
		expect(one.token.startsWith(one.prefix)).toBe(true);
		expect(one.hash.equals(hashToken(one.token))).toBe(true);
	});

	// NIST, "SHA Test Vectors for Hashing Byte-Oriented Messages": SHA-256 of "abc" (FIPS 180-2, appendix B.1).
	it('hashes with SHA-256', () => {
		expect(hashToken('abc').toString('hex')).toBe('ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad');
	});
});

describe('passwords', () => {
	it('are kept as Argon2id, salted, and verified', async () => {
		const [one, two] = await Promise.all([
			hashPassword('correct horse battery'),
			hashPassword('correct horse battery')
		]);
		expect(one).toMatch(/^\$argon2id\$v=19\$m=(\d+),t=(\d+),p=\d+\$/);
		const [, memory, passes] = /m=(\d+),t=(\d+)/.exec(one)!.map(Number);
		// OWASP Password Storage Cheat Sheet: Argon2id with at least 19 MiB and two passes (common practice).
		expect(memory).toBeGreaterThanOrEqual(19 * 1024);
		expect(passes).toBeGreaterThanOrEqual(2);
		expect(one).not.toBe(two);
		expect(await verifyPassword(one, 'correct horse battery')).toBe(true);
		expect(await verifyPassword(one, 'correct horse batterie')).toBe(false);
	});

	it('of nobody are never right', async () => {
		expect(await verifyPassword(null, 'nobody has this password')).toBe(false);
	});
});

describe('SignInAttempts', () => {
	const fail = async (attempts: SignInAttempts, times: number, email: string, address: string) => {
		for (let i = 0; i < times; i++) await attempts.begin(email, address);
	};

	it('stops guessing one person’s password, whatever the letters of the e-mail', async () => {
		const attempts = new SignInAttempts();
		await fail(attempts, 10, 'ada@planish.test', '192.0.2.1');
		await expect(attempts.begin('ADA@planish.test', '192.0.2.1')).rejects.toMatchObject({ code: 'too-many-requests' });
		await expect(attempts.begin('bob@planish.test', '192.0.2.1')).resolves.toBeUndefined();
		await expect(attempts.begin('ada@planish.test', '192.0.2.2')).resolves.toBeUndefined();
	});

	it('stops one address that tries many people', async () => {
		const attempts = new SignInAttempts();
		for (let i = 0; i < 100; i++) await attempts.begin(`person-${i}@planish.test`, '192.0.2.1');
		await expect(attempts.begin('ada@planish.test', '192.0.2.1')).rejects.toMatchObject({ code: 'too-many-requests' });
	});

	it('does not count those who know their password', async () => {
		const attempts = new SignInAttempts();
		for (let i = 0; i < 150; i++) {
			await attempts.begin('ada@planish.test', '192.0.2.1');
			await attempts.succeed('ada@planish.test', '192.0.2.1');
		}
		await expect(attempts.begin('ada@planish.test', '192.0.2.1')).resolves.toBeUndefined();
	});
});
