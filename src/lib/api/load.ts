import { error } from '@sveltejs/kit';
import { ApiProblem, createClient, type ApiClient } from './client';

/** Loads page data through the API with the event's `fetch`; a refusal becomes the page's error with the same status. */
export async function loadFrom<T>(fetcher: typeof fetch, ask: (api: ApiClient) => Promise<T>): Promise<T> {
	try {
		return await ask(createClient(fetcher));
	} catch (cause) {
		if (cause instanceof ApiProblem && cause.status >= 400) error(cause.status, cause.detail || cause.title);
		throw cause;
	}
}
