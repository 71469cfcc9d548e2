/** Every reason for which the server refuses, one table to HTTP, and the RFC 9457 answer that requests and jobs share. */
import { randomUUID } from 'node:crypto';
import type { Problem } from '$lib/api/schemas/common';
import type { MorphError, MorphErrorCode, MorphPlace } from '$lib/morph';
import { log } from './log';

const TABLE = {
	malformed: { status: 400, title: 'The request can’t be read' },
	unauthenticated: { status: 401, title: 'Sign in first' },
	forbidden: { status: 403, title: 'Not allowed' },
	'cross-site': { status: 403, title: 'The request comes from another site' },
	'not-found': { status: 404, title: 'Not found' },
	'no-such-call': { status: 404, title: 'No such call' },
	'method-not-allowed': { status: 405, title: 'This address has no such method' },
	conflict: { status: 409, title: 'It clashes with what is there' },
	cancelled: { status: 409, title: 'Cancelled' },
	'too-large': { status: 413, title: 'Too large' },
	'wrong-type': { status: 415, title: 'Wrong kind of content' },
	invalid: { status: 422, title: 'Some values are not valid' },
	'bad-file': { status: 422, title: 'The file can’t be used' },
	unsupported: { status: 422, title: 'Planish can’t do this' },
	'no-map': { status: 422, title: 'A sensitivity map is missing' },
	'no-result': { status: 422, title: 'A result is missing' },
	'check-failed': { status: 422, title: 'The moved surface breaks a check' },
	infeasible: { status: 422, title: 'No move can satisfy this' },
	'too-many-requests': { status: 429, title: 'Too many attempts' },
	corrupt: { status: 500, title: 'Stored data fails its check sum' },
	internal: { status: 500, title: 'Something went wrong' },
	unavailable: { status: 503, title: 'Not available just now' }
} as const satisfies Record<string, { status: number; title: string }>;

export type ErrorCode = keyof typeof TABLE;

/** One field at fault: an RFC 6901 JSON pointer into the body; for a query value `/name`. */
export interface FieldError {
	pointer: string;
	detail: string;
}

export interface AppErrorOptions {
	/** What to do about it, as a sentence. */
	mend?: string;
	errors?: FieldError[];
	cause?: unknown;
	/** Seconds after which another try makes sense; becomes `Retry-After`. */
	retryAfter?: number;
}

/** A refusal with a reason that the caller may read. Everything else that is thrown is a fault of ours. */
export class AppError extends Error {
	override readonly name = 'AppError';
	readonly mend: string | undefined;
	readonly errors: FieldError[] | undefined;
	readonly retryAfter: number | undefined;

	/** @param detail what is wrong, in a sentence that names the thing */
	constructor(
		readonly code: ErrorCode,
		detail: string,
		{ mend, errors, cause, retryAfter }: AppErrorOptions = {}
	) {
		super(detail, { cause });
		this.mend = mend;
		this.errors = errors;
		this.retryAfter = retryAfter;
	}

	get status(): number {
		return TABLE[this.code].status;
	}
}

export const statusOf = (code: ErrorCode): number => TABLE[code].status;
export const titleOf = (code: ErrorCode): string => TABLE[code].title;
export const errorCodes = Object.keys(TABLE) as ErrorCode[];

const MORPH_CODES: Record<MorphErrorCode, ErrorCode> = {
	'stl-empty': 'bad-file',
	'stl-truncated': 'bad-file',
	'stl-not-stl': 'bad-file',
	'stl-syntax': 'bad-file',
	'stl-non-finite': 'bad-file',
	'file-empty': 'bad-file',
	'file-unknown': 'bad-file',
	'file-truncated': 'bad-file',
	'file-syntax': 'bad-file',
	'file-non-finite': 'bad-file',
	'file-unsupported': 'bad-file',
	'file-too-large': 'too-large',
	'csv-empty': 'bad-file',
	'csv-syntax': 'bad-file',
	'csv-non-finite': 'bad-file',
	'map-shape': 'bad-file',
	'map-unmatched': 'bad-file',
	'mesh-shape': 'bad-file',
	'mesh-non-finite': 'bad-file',
	'mesh-open': 'unsupported',
	'box-invalid': 'invalid',
	'box-empty': 'invalid',
	'no-free-points': 'invalid',
	'metric-singular': 'infeasible',
	'gradient-zero': 'infeasible',
	'gradient-missing': 'no-map',
	'step-invalid': 'invalid',
	'smoothing-invalid': 'invalid',
	'constraint-invalid': 'invalid',
	'constraint-conflict': 'infeasible',
	'step-unreachable': 'infeasible',
	'symmetry-invalid': 'invalid',
	'hand-invalid': 'invalid',
	'keep-out-invalid': 'invalid',
	'keep-out-open': 'invalid',
	'thickness-invalid': 'invalid',
	'lock-invalid': 'invalid',
	'part-invalid': 'invalid',
	'rehearsal-invalid': 'invalid',
	unsupported: 'unsupported'
};

/** The recipe's field that an engine's refusal is about, as a JSON pointer. */
function morphPointer(code: MorphErrorCode, place: MorphPlace | undefined): string | undefined {
	if (place?.constraint !== undefined) return `/constraints/${place.constraint}`;
	if (code === 'step-invalid' || code === 'step-unreachable') return '/step';
	if (code === 'symmetry-invalid') return '/symmetry';
	if (code === 'hand-invalid') return '/hand';
	if (code === 'smoothing-invalid') return '/smoothing';
	if (code === 'box-invalid' || code === 'box-empty' || code === 'no-free-points') return '/boxIds';
	return undefined;
}

/** By its name: this module is part of every request's path, which has no use for the engine itself. */
const isMorphError = (thrown: unknown): thrown is MorphError =>
	thrown instanceof Error && thrown.name === 'MorphError' && Object.hasOwn(MORPH_CODES, (thrown as MorphError).code);

function fromMorph(error: MorphError): AppError {
	const pointer = morphPointer(error.code, error.place);
	return new AppError(MORPH_CODES[error.code], error.message, {
		mend: error.mend,
		errors: pointer ? [{ pointer, detail: error.message }] : undefined,
		cause: error
	});
}

/** No connection, or one that broke in the middle of a query: PostgreSQL's class 08 and its words at a shutdown, or none at all. */
function isLostDatabase(error: Error): boolean {
	if (/^Sequelize(Connection|HostNot|AccessDenied)/.test(error.name)) return true;
	const { code = '' } = ((error as { original?: unknown }).original ?? error) as { code?: unknown };
	return (
		/^(08...|57P0[123]|ECONNRESET|ECONNREFUSED|EPIPE)$/.test(String(code)) ||
		/^Connection terminated/.test(error.message)
	);
}

/**
 * The refusal in whatever was thrown: an AppError as it is, an engine's refusal by the table above, a lost database as
 * `unavailable`, and anything else as `internal` under a new id, its details in the log alone.
 */
export function asAppError(thrown: unknown): AppError {
	if (thrown instanceof AppError) {
		if (thrown.status >= 500) log.error({ err: thrown, code: thrown.code }, thrown.message);
		return thrown;
	}
	if (isMorphError(thrown)) return fromMorph(thrown);
	const errorId = randomUUID();
	if (thrown instanceof Error && isLostDatabase(thrown)) {
		log.error({ err: thrown, errorId }, 'the database does not answer');
		return new AppError('unavailable', 'The database does not answer.', {
			mend: 'Try again in a moment. Nothing that was committed is lost.',
			cause: thrown,
			retryAfter: 5
		});
	}
	log.error({ err: thrown, errorId }, 'unexpected error');
	return new AppError('internal', `An unexpected error, recorded in the server’s log as ${errorId}.`, {
		mend: 'Try again; if it comes back, give the number to whoever runs this installation.',
		cause: thrown
	});
}

/** The RFC 9457 problem that says it. */
export function problemOf(error: AppError): Problem {
	return {
		type: `urn:planish:problem:${error.code}`,
		title: titleOf(error.code),
		status: error.status,
		detail: error.message,
		code: error.code,
		...(error.mend && { mend: error.mend }),
		...(error.errors?.length && { errors: error.errors })
	};
}

/** The problem for whatever was thrown; requests answer it, jobs store it. Faults of ours are logged here. */
export const toProblem = (thrown: unknown): Problem => problemOf(asAppError(thrown));
