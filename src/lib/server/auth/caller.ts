/** Who makes a call, as the hooks find it and the services take it. */
import type { Role } from '$lib/api/schemas/common';

/** A person as read from the database for this request. */
export interface SignedInUser {
	id: string;
	email: string;
	name: string;
	isAdmin: boolean;
}

/** Who acts, for the audit record. */
export interface Actor {
	userId: string;
	/** The API token that the call came with; null for a session. */
	tokenId: string | null;
}

export interface Caller extends Actor {
	isAdmin: boolean;
	/** The only study that the call's token may touch; null: all of its owner's. */
	tokenStudyId: string | null;
}

/** What the caller may do in the study that the call is about. */
export interface StudyAccess extends Actor {
	studyId: string;
	role: Role;
}
