/** Cross-site request forgery: a browser must not change things in a person's name from another site's page. */

const SAFE = new Set(['GET', 'HEAD', 'OPTIONS']);

export interface Sender {
	method: string;
	/** The Origin header; browsers send it with every request that changes something. */
	origin: string | null;
	/** The Host header: where the request was sent to, by whatever name the person typed. */
	host: string | null;
	/** The installation's own origin, for proxies that rewrite Host. */
	siteOrigin: string;
	/** It comes with a bearer token, which no browser adds by itself. */
	bearer: boolean;
	/** A page's form or a session can act; false for an API call without a session cookie, which can do nothing. */
	canAct: boolean;
}

/** Must the request be refused? Without an Origin it must: whoever holds a session in a browser sends one. */
export function isForged({ method, origin, host, siteOrigin, bearer, canAct }: Sender): boolean {
	if (SAFE.has(method) || bearer || !canAct) return false;
	if (!origin || !URL.canParse(origin)) return true;
	return new URL(origin).host !== host && origin !== siteOrigin;
}
