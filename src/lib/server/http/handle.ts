/**
 * Turns a row of the API's contract into a SvelteKit handler: finds out who calls, finds the study with the caller's
 * membership in the query, checks role and token, validates, calls, and lets only the listed fields of the answer leave.
 */
import { isHttpError, isRedirect, json, type RequestEvent, type RequestHandler } from '@sveltejs/kit';
import type { z } from 'zod';
import type { Operation, Subject } from '$lib/api/contract/operation';
import type { Role } from '$lib/api/schemas/common';
import type { Caller, SignedInUser, StudyAccess } from '../auth/caller';
import { AppError } from '../errors';
import { findStudyAccess, type StudySubject } from '../repositories/access';
import { isUuid, readJson, validateBody, validateQuery } from './input';
import { problemResponse, refuse } from './problem';

type PathNames<P extends string> = P extends `${string}{${infer N}}${infer Rest}` ? N | PathNames<Rest> : never;

/** Study calls get the study and the role in it, public ones nothing, the others the caller. */
type AccessOf<O extends Operation> = O['access'] extends 'public'
	? null
	: O['subject'] extends 'user' | 'token' | 'none'
		? Caller
		: StudyAccess;

export interface CallContext<O extends Operation> {
	/** The path's names; each is a UUID. */
	params: Record<PathNames<O['path']>, string>;
	query: O extends { query: infer Q extends z.ZodType } ? z.output<Q> : Record<string, never>;
	body: O extends { body: infer B extends z.ZodType } ? z.output<B> : undefined;
	user: O['access'] extends 'public' ? SignedInUser | null : SignedInUser;
	access: AccessOf<O>;
	event: RequestEvent;
}

type AnswerOf<O extends Operation> = O['answer'] extends z.ZodType
	? z.input<O['answer']>
	: O['answer'] extends 'none'
		? void
		: Response;

const RANK: Record<Role, number> = { viewer: 0, reviewer: 1, engineer: 2 };
const WORD: Record<Subject, string> = {
	study: 'study',
	shape: 'shape',
	topology: 'mesh',
	map: 'map',
	box: 'design box',
	keepOut: 'keep-out',
	lock: 'lock',
	objective: 'objective',
	job: 'job',
	user: 'person',
	token: 'token',
	none: 'thing'
};

function notFound(subject: Subject): AppError {
	const what = `There is no such ${WORD[subject]}`;
	if (!isOfStudy(subject)) return new AppError('not-found', `${what}.`);
	return new AppError('not-found', `${what}, or you have no part in ${subject === 'study' ? 'it' : 'its study'}.`);
}

const isOfStudy = (subject: Subject): subject is StudySubject =>
	subject !== 'user' && subject !== 'token' && subject !== 'none';

async function studyAccess(
	operation: Operation,
	subject: StudySubject,
	id: string,
	caller: Caller
): Promise<StudyAccess> {
	const found = await findStudyAccess(subject, id, caller);
	if (!found) throw notFound(subject);
	const needed = operation.access as Role;
	if (RANK[found.role] < RANK[needed]) {
		throw new AppError('forbidden', `This needs the role ${needed}; in this study you are ${found.role}.`, {
			mend: 'An engineer of the study can change your role.'
		});
	}
	return { ...found, userId: caller.userId, tokenId: caller.tokenId };
}

async function authorise(operation: Operation, event: RequestEvent): Promise<Caller | StudyAccess | null> {
	if (operation.access === 'public') return null;
	const { caller } = event.locals;
	if (!caller) {
		throw new AppError('unauthenticated', 'This call needs a session or an API token.', {
			mend: 'Sign in, or send the header Authorization: Bearer TOKEN.'
		});
	}
	const params: Partial<Record<string, string>> = event.params;
	for (const value of Object.values(params)) if (!isUuid(value)) throw notFound(operation.subject);
	if (operation.access === 'admin' && (!caller.isAdmin || caller.tokenStudyId)) {
		throw new AppError('forbidden', 'Only an admin of this installation may do this.');
	}
	const { subject } = operation;
	return isOfStudy(subject) ? studyAccess(operation, subject, params.id!, caller) : caller;
}

function respond(operation: Operation, answer: unknown): Response {
	if (answer instanceof Response) return answer;
	if (operation.answer === 'none') return new Response(null, { status: operation.status });
	// A service that answers less than the contract promises is a fault of ours: it throws here and is logged.
	const body = (operation.answer as z.ZodType).parse(answer);
	return json(body, { status: operation.status, headers: { 'cache-control': 'no-store' } });
}

/**
 * A handler for one operation of the contract. What `call` returns is sent with the operation's status; for 'bytes' and
 * 'events' it returns the Response itself. Whatever it throws becomes problem+json.
 */
export function handle<const O extends Operation>(
	operation: O,
	call: (context: CallContext<O>) => Promise<AnswerOf<O>> | AnswerOf<O>
): RequestHandler {
	return async (event) => {
		try {
			const access = await authorise(operation, event);
			const query = operation.query ? validateQuery(operation.query, event.url.searchParams) : {};
			const body =
				operation.body === undefined || operation.body === 'bytes'
					? undefined
					: validateBody(operation.body, await readJson(event.request));
			const context = { params: event.params, query, body, user: event.locals.user, access, event };
			return respond(operation, await call(context as unknown as CallContext<O>));
		} catch (thrown) {
			if (isRedirect(thrown) || isHttpError(thrown)) throw thrown;
			// Nobody reads this answer: it keeps the broken stream of an upload that was called off out of the log's errors.
			if (event.request.signal.aborted) return problemResponse(new AppError('cancelled', 'The caller hung up.'));
			return refuse(event.request, thrown);
		}
	};
}
