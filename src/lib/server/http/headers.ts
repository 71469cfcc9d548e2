/** Headers that keep a browser from being used against its owner. Pages get their content policy from svelte.config.js. */

const ALWAYS: Record<string, string> = {
	'x-content-type-options': 'nosniff',
	'x-frame-options': 'DENY',
	'referrer-policy': 'same-origin',
	'cross-origin-opener-policy': 'same-origin',
	'cross-origin-resource-policy': 'same-origin',
	'permissions-policy': 'camera=(), geolocation=(), microphone=()'
};

/** For what is no page: nothing in it may run or load anything. */
const DATA_POLICY = "default-src 'none'; frame-ancestors 'none'";

/** The answer with them where it has none of its own. A new one, since a redirect's headers can't be changed. */
export function secured(response: Response): Response {
	const headers = new Headers(response.headers);
	for (const [name, value] of Object.entries(ALWAYS)) if (!headers.has(name)) headers.set(name, value);
	const isPage = headers.get('content-type')?.startsWith('text/html');
	if (!isPage && !headers.has('content-security-policy')) headers.set('content-security-policy', DATA_POLICY);
	return new Response(response.body, { status: response.status, statusText: response.statusText, headers });
}
