/** What every request passes: its log line, the check for forged ones, who calls, and the guard of the pages. */
import { randomUUID } from 'node:crypto';
import {
	error,
	redirect,
	type Handle,
	type HandleServerError,
	type RequestEvent,
	type ServerInit
} from '@sveltejs/kit';
import { sequence } from '@sveltejs/kit/hooks';
import { building } from '$app/environment';
import { handle as authRoutes, hasSessionCookie, readSession } from './auth';
import { bearerOf } from '$lib/server/auth/bearer';
import { isForged } from '$lib/server/auth/csrf';
import { identifySession, identifyToken } from '$lib/server/auth/identify';
import { AppError } from '$lib/server/errors';
import { secured } from '$lib/server/http/headers';
import { refuse } from '$lib/server/http/problem';
import { startServing } from '$lib/server/lifecycle';
import { log } from '$lib/server/log';

const THEMES = ['light', 'dark'];

const isApi = ({ url }: RequestEvent) => url.pathname === '/api' || url.pathname.startsWith('/api/');

export const init: ServerInit = async () => {
	if (!building) await startServing();
};

const record: Handle = async ({ event, resolve }) => {
	const start = performance.now();
	const response = secured(await resolve(event));
	const line = {
		method: event.request.method,
		path: event.url.pathname,
		status: response.status,
		ms: Math.round(performance.now() - start),
		userId: event.locals.user?.id
	};
	log[event.isSubRequest || event.url.pathname === '/api/health' ? 'debug' : 'info'](line, 'request');
	return response;
};

const refuseForged: Handle = ({ event, resolve }) => {
	const { request, url } = event;
	const forged = isForged({
		method: request.method,
		origin: request.headers.get('origin'),
		host: request.headers.get('host'),
		siteOrigin: url.origin,
		bearer: bearerOf(request.headers.get('authorization')) !== null,
		canAct: !isApi(event) || hasSessionCookie(event)
	});
	// What a page asks for while it is rendered on the server comes from our own code.
	if (!forged || event.isSubRequest) return resolve(event);
	const detail = `The request’s origin, ${request.headers.get('origin') ?? '(none)'}, is not this site, ${url.origin}.`;
	const mend = isApi(event)
		? 'Programs send an API token instead of a session.'
		: 'Open Planish by its own address; behind a proxy, whoever runs it sets ORIGIN to the public one.';
	if (event.route.id && !isApi(event)) error(403, `${detail} ${mend}`);
	return refuse(request, new AppError('cross-site', detail, { mend }));
};

const identify: Handle = async ({ event, resolve }) => {
	event.locals.user = null;
	event.locals.caller = null;
	if (building) return resolve(event);
	try {
		const bearer = bearerOf(event.request.headers.get('authorization'));
		const renew = event.request.method === 'GET' && !isApi(event) && !event.isSubRequest;
		const claim = bearer === null ? await readSession(event, { renew }) : null;
		const identity = bearer === null ? claim && (await identifySession(claim)) : await identifyToken(bearer);
		if (identity) Object.assign(event.locals, identity);
	} catch (thrown) {
		if (isApi(event) || thrown instanceof AppError) return refuse(event.request, thrown);
		throw thrown;
	}
	return resolve(event);
};

const guardPages: Handle = ({ event, resolve }) => {
	if (event.route.id?.startsWith('/(app)') && !event.locals.user) {
		redirect(303, `/sign-in?to=${encodeURIComponent(event.url.pathname + event.url.search)}`);
	}
	const theme = event.cookies.get('theme') ?? '';
	return resolve(event, {
		transformPageChunk: ({ html }) => html.replace('%planish.theme%', THEMES.includes(theme) ? theme : 'system')
	});
};

/** The calls that exist answer problem+json by themselves; SvelteKit's own refusal of a method does not. */
const explainMethods: Handle = async ({ event, resolve }) => {
	const response = await resolve(event);
	if (!isApi(event) || response.status !== 405) return response;
	const allow = response.headers.get('allow') ?? '';
	const problem = refuse(
		event.request,
		new AppError('method-not-allowed', `${event.url.pathname} takes ${allow}, not ${event.request.method}.`)
	);
	problem.headers.set('allow', allow);
	return problem;
};

export const handle = sequence(record, refuseForged, identify, authRoutes, explainMethods, guardPages);

export const handleError: HandleServerError = ({ error: thrown, event, status, message }) => {
	if (status < 500) return { message };
	const id = randomUUID();
	log.error({ err: thrown, errorId: id, path: event.url.pathname }, 'unexpected error');
	return { message: `Something went wrong. The server’s log has it as ${id}.`, id };
};
