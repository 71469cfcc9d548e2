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

/** Sets them where the answer has none of its own. */
export function secure(response: Response): void {
	const { headers } = response;
	for (const [name, value] of Object.entries(ALWAYS)) if (!headers.has(name)) headers.set(name, value);
	const isPage = headers.get('content-type')?.startsWith('text/html');
	if (!isPage && !headers.has('content-security-policy')) headers.set('content-security-policy', DATA_POLICY);
}
