import type { RequestHandler } from '@sveltejs/kit';
import { AppError } from '$lib/server/errors';
import { refuse } from '$lib/server/http/problem';

/** Whatever no other route under /api answers. */
export const fallback: RequestHandler = ({ url, request }) =>
	refuse(
		request,
		new AppError('no-such-call', `There is no ${request.method} ${url.pathname}.`, {
			mend: 'GET /api/openapi.json lists every call.'
		})
	);
