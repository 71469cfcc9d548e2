import { asAppError, problemOf } from '../errors';
import { discardRest } from './input';

/** An RFC 9457 answer for whatever was thrown. */
export function problemResponse(thrown: unknown): Response {
	const error = asAppError(thrown);
	const headers = new Headers({ 'content-type': 'application/problem+json', 'cache-control': 'no-store' });
	if (error.status === 401) headers.set('www-authenticate', 'Bearer realm="Planish"');
	if (error.retryAfter !== undefined) headers.set('retry-after', String(Math.ceil(error.retryAfter)));
	return new Response(JSON.stringify(problemOf(error)), { status: error.status, headers });
}

/** The same for a request whose body nobody has read to its end. */
export function refuse(request: Request, thrown: unknown): Response {
	void discardRest(request);
	return problemResponse(thrown);
}
