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
	/** Empty the form after success: for forms that add something. */
	reset?: boolean;
	onbusy?: (busy: boolean) => void;
}): SubmitFunction {
	const { client, notices, done, reset = false, onbusy } = options;
	return () => {
		onbusy?.(true);
		return async ({ result, update }) => {
			try {
				if (result.type === 'error') notices.refused(asProblem(new Error(messageOf(result.error))));
				else await update({ reset: reset && result.type === 'success' });
				if (result.type === 'success' || result.type === 'redirect') {
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
