/** Sessions by Auth.js: signed and encrypted cookies that name a person and their session epoch, nothing more. */
import { Auth, raw, skipCSRFCheck, type AuthConfig } from '@auth/core';
import { CredentialsSignin } from '@auth/core/errors';
import { getToken } from '@auth/core/jwt';
import CredentialsProvider from '@auth/core/providers/credentials';
import { SvelteKitAuth } from '@auth/sveltekit';
import type { RequestEvent } from '@sveltejs/kit';
import { env } from '$env/dynamic/private';
import { SignInAttempts } from '$lib/server/auth/attempts';
import { identifySession, type SessionClaim } from '$lib/server/auth/identify';
import { checkCredentials } from '$lib/server/auth/sign-in';
import { AppError } from '$lib/server/errors';
import { log } from '$lib/server/log';

const BASE_PATH = '/auth';
const SESSION_SECONDS = 14 * 24 * 3600;
const RENEW_AFTER_SECONDS = 24 * 3600;
const attempts = new SignInAttempts();

/** A refusal by the limiter, in the shape that passes through Auth.js. */
class TooManyAttempts extends CredentialsSignin {
	override code = 'too-many-requests';
	constructor(readonly refusal: AppError) {
		super(refusal.message);
	}
}

const isSecure = (url: URL) => url.protocol === 'https:';

/** Cookies do not tell ports apart; the name does, so that two installations on one host do not sign each other out. */
const cookieName = (url: URL) => `${isSecure(url) ? '__Secure-' : ''}planish-session${url.port && `-${url.port}`}`;

async function authorize(given: Partial<Record<string, unknown>>, address: string) {
	const email = typeof given.email === 'string' ? given.email.trim() : '';
	const password = typeof given.password === 'string' ? given.password : '';
	try {
		return await checkCredentials(attempts, { email, password, address });
	} catch (thrown) {
		if (thrown instanceof AppError && thrown.code === 'too-many-requests') throw new TooManyAttempts(thrown);
		throw thrown;
	}
}

function claimOf(token: Record<string, unknown> | null): SessionClaim | null {
	if (typeof token?.sub !== 'string' || typeof token.epoch !== 'number') return null;
	return { userId: token.sub, sessionEpoch: token.epoch };
}

const configFor = (event: RequestEvent): AuthConfig & { basePath: string } => ({
	basePath: BASE_PATH,
	secret: env.AUTH_SECRET,
	trustHost: true,
	// hooks.server.ts compares Origin and Host for these routes as for all others.
	skipCSRFCheck,
	session: { strategy: 'jwt', maxAge: SESSION_SECONDS },
	useSecureCookies: isSecure(event.url),
	cookies: { sessionToken: { name: cookieName(event.url) } },
	pages: { signIn: '/sign-in', signOut: '/sign-out', error: '/sign-in' },
	providers: [
		CredentialsProvider({
			credentials: { email: { type: 'email' }, password: { type: 'password' } },
			authorize: (given) => authorize(given, event.getClientAddress())
		})
	],
	callbacks: {
		jwt: async ({ token, user }) => {
			if (user) return { sub: user.id, epoch: (user as unknown as SessionClaim).sessionEpoch };
			const claim = claimOf(token);
			return claim && (await identifySession(claim)) ? token : null;
		},
		session: ({ session, token }) => ({ expires: session.expires, user: { id: token.sub } })
	},
	logger: {
		error: (error) => {
			// A refused sign-in is not a fault of ours.
			if (!(error instanceof CredentialsSignin)) log.error({ err: error }, 'sign-in failed unexpectedly');
		},
		warn: (code) => log.warn({ code }, 'Auth.js warns'),
		debug: () => {}
	}
});

/** Auth.js's own routes under /auth. */
export const { handle } = SvelteKitAuth((event) => Promise.resolve(configFor(event)));

/** Calls one of Auth.js's actions and sets the cookies that it answers. */
async function act(event: RequestEvent, action: string, fields: Record<string, string>): Promise<void> {
	const request = new Request(new URL(`${BASE_PATH}/${action}`, event.url), {
		method: 'POST',
		headers: { cookie: event.request.headers.get('cookie') ?? '', 'content-type': 'application/x-www-form-urlencoded' },
		body: new URLSearchParams({ ...fields, callbackUrl: event.url.origin })
	});
	const { cookies = [] } = await Auth(request, { ...configFor(event), raw });
	for (const { name, value, options } of cookies) event.cookies.set(name, value, { path: '/', ...options });
}

/**
 * Signs a person in on this response.
 *
 * @returns null, or the refusal: `unauthenticated` or `too-many-requests`
 */
export async function signIn(event: RequestEvent, email: string, password: string): Promise<AppError | null> {
	try {
		await act(event, 'callback/credentials', { email, password });
		return null;
	} catch (thrown) {
		if (thrown instanceof TooManyAttempts) return thrown.refusal;
		if (!(thrown instanceof CredentialsSignin)) throw thrown;
		return new AppError('unauthenticated', 'E-mail and password do not match, or this person may not sign in.');
	}
}

/** Ends the session on this response. */
export const signOut = (event: RequestEvent): Promise<void> => act(event, 'signout', {});

export const hasSessionCookie = (event: RequestEvent): boolean =>
	event.cookies.getAll().some(({ name }) => name.startsWith(cookieName(event.url)));

/** What the session cookie claims, if it is one of ours and has not run out. Renews an old one when a page is loaded. */
export async function readSession(event: RequestEvent, { renew }: { renew: boolean }): Promise<SessionClaim | null> {
	if (!hasSessionCookie(event)) return null;
	const name = cookieName(event.url);
	const token = await getToken({
		// The cookie alone: getToken would take an Authorization header for a session as well.
		req: { headers: { cookie: event.request.headers.get('cookie') ?? '' } },
		secret: env.AUTH_SECRET,
		cookieName: name,
		salt: name,
		secureCookie: isSecure(event.url)
	});
	const claim = claimOf(token);
	if (claim && renew && (token?.iat ?? 0) < Date.now() / 1000 - RENEW_AFTER_SECONDS) await event.locals.auth();
	return claim;
}
