import type { SubmitFunction } from '@sveltejs/kit';
import type { QueryClient } from '@tanstack/svelte-query';
import { asProblem } from '$lib/api/client';
import type { Notices } from './notices.svelte';

/**
 * For `use:enhance`: sends the form without leaving the page, keeps what was typed when it is refused, says in a notice what
 * was done, and lets every cached query ask again.
 */
export function enhanced(options: {
	client: QueryClient;
	notices: Notices;
	done?: string;
	onsuccess?: () => void;
	onbusy?: (busy: boolean) => void;
}): SubmitFunction {
	const { client, notices, done, onsuccess, onbusy } = options;
	return () => {
		onbusy?.(true);
		return async ({ result, update }) => {
			try {
				if (result.type === 'error') notices.refused(asProblem(new Error(messageOf(result.error))));
				// The browser's own reset would empty what a field shows at first.
				else await update({ reset: false });
				if (result.type === 'success' || result.type === 'redirect') {
					onsuccess?.();
					if (done) notices.done(done);
					await client.invalidateQueries();
				}
			} finally {
				onbusy?.(false);
			}
		};
	};
}

function messageOf(error: unknown): string {
	return error && typeof error === 'object' && 'message' in error ? String(error.message) : 'Something went wrong.';
}
