import '@auth/sveltekit';
import type { Caller, SignedInUser } from '$lib/server/auth/caller';

declare global {
	namespace App {
		interface Locals {
			/** Who calls, by session or bearer token; null when nobody is signed in. Read anew for each request. */
			user: SignedInUser | null;
			/** The same with what limits the call, as services take it. */
			caller: Caller | null;
		}
		interface Error {
			message: string;
			/** Number under which the server's log has the details of an unexpected error. */
			id?: string;
		}
	}
}

export {};
