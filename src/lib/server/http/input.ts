/** Reads and validates what a call brings: path, query and JSON body, each fault with a pointer to its field. */
import type { z } from 'zod';
import { AppError, type FieldError } from '../errors';

/** Largest JSON body, bytes. Files are streamed by their own handlers. */
export const JSON_LIMIT = 2_000_000;

const UUID = /^[0-9a-f]{8}(-[0-9a-f]{4}){3}-[0-9a-f]{12}$/i;

export const isUuid = (value: string | undefined): value is string => value !== undefined && UUID.test(value);

const pointer = (path: readonly PropertyKey[]) =>
	path.map((part) => '/' + String(part).replaceAll('~', '~0').replaceAll('/', '~1')).join('');

function fieldErrors(error: z.ZodError): FieldError[] {
	return error.issues.map((issue) => ({ pointer: pointer(issue.path), detail: issue.message }));
}

/**
 * Fields of the input that the schema dropped. Refused, since a misspelt optional field would otherwise be a default in
 * silence. Right for schemas that keep the input's structure, as all of ours do.
 */
function unknownFields(input: unknown, output: unknown, path: PropertyKey[] = []): FieldError[] {
	if (Array.isArray(input) && Array.isArray(output)) {
		return input.flatMap((item, i) => unknownFields(item, output[i], [...path, i]));
	}
	if (typeof input !== 'object' || typeof output !== 'object' || input === null || output === null) return [];
	return Object.entries(input).flatMap(([key, value]) =>
		Object.hasOwn(output, key)
			? unknownFields(value, (output as Record<string, unknown>)[key], [...path, key])
			: [{ pointer: pointer([...path, key]), detail: 'is no field of this call' }]
	);
}

/** What is wrong with a value, in words that fit behind the field's name; schemas that have words of their own keep them. */
const inWords: z.core.$ZodErrorMap = (issue) => {
	if (issue.code === 'invalid_type') return issue.input === undefined ? 'is missing' : `must be ${issue.expected}`;
	if (issue.code === 'invalid_value')
		return `must be ${issue.values.length > 1 ? 'one of ' : ''}${issue.values.join(', ')}`;
	if (issue.code === 'too_small' || issue.code === 'too_big') {
		const small = issue.code === 'too_small';
		const limit = small ? issue.minimum : issue.maximum;
		if (issue.origin === 'string' && small && limit === 1) return 'must not be empty';
		const unit = UNITS[issue.origin] ?? '';
		const open = unit === '' && !issue.inclusive;
		const side = small ? (open ? 'more than' : 'at least') : open ? 'less than' : 'at most';
		return unit ? `must have ${side} ${limit}${unit}` : `must be ${side} ${limit}`;
	}
	if (issue.code === 'invalid_format') return `is no ${FORMATS[issue.format] ?? issue.format}`;
	return undefined;
};
const UNITS: Record<string, string> = { string: ' characters', array: ' entries' };
const FORMATS: Record<string, string> = { email: 'e-mail address', uuid: 'UUID', datetime: 'date and time' };

function validate<S extends z.ZodType>(schema: S, input: unknown, what: string): z.output<S> {
	const parsed = schema.safeParse(input, { error: inWords });
	const errors = parsed.success ? unknownFields(input, parsed.data) : fieldErrors(parsed.error);
	if (parsed.success && errors.length === 0) return parsed.data;
	const first = errors[0];
	throw new AppError('invalid', `${what}: ${first.pointer ? `${first.pointer.slice(1)} ` : ''}${first.detail}.`, {
		errors,
		mend: errors.length > 1 ? `Correct the ${errors.length} fields that are listed.` : 'Correct it and send it again.'
	});
}

/** @throws AppError invalid, with a pointer by field; also for fields that the schema does not know */
export const validateBody = <S extends z.ZodType>(schema: S, body: unknown) =>
	validate(schema, body, 'The request’s body is not valid');

/** @throws AppError invalid; also for a name that the schema does not know or that is given twice */
export function validateQuery<S extends z.ZodType>(schema: S, query: URLSearchParams): z.output<S> {
	for (const key of new Set(query.keys())) {
		if (query.getAll(key).length > 1) {
			throw new AppError('invalid', `The query gives ${key} more than once.`, {
				errors: [{ pointer: pointer([key]), detail: 'is given more than once' }]
			});
		}
	}
	return validate(schema, Object.fromEntries(query), 'The query is not valid');
}

/** How long the rest of a refused body is still taken, ms. */
const LINGER_MS = 30_000;

/**
 * Takes what a refused call still sends and throws it away: a connection with an unread body would stall its next request,
 * and closing it at once would take the refusal with it. Reads at most for LINGER_MS, then closes.
 */
export async function discardRest(request: Request): Promise<void> {
	if (!request.body || request.body.locked) return;
	const reader = request.body.getReader();
	const late = setTimeout(() => void reader.cancel().catch(() => undefined), LINGER_MS);
	// A caller who hung up may leave the reading open; the end of the process does not wait for that.
	late.unref();
	try {
		while (!(await reader.read()).done);
	} catch {
		// The caller hung up: nothing is left to take.
	} finally {
		clearTimeout(late);
	}
}

/** The body's bytes as text, read no further than the limit. */
async function readText(request: Request): Promise<string> {
	const tooLarge = () =>
		new AppError('too-large', `The JSON body is larger than ${JSON_LIMIT / 1_000_000} MB.`, {
			mend: 'Send less; files go to the upload calls as they are.'
		});
	if (Number(request.headers.get('content-length') ?? 0) > JSON_LIMIT) throw tooLarge();
	const chunks: Uint8Array[] = [];
	let size = 0;
	const reader = request.body?.getReader();
	try {
		for (let part = await reader?.read(); part && !part.done; part = await reader?.read()) {
			size += part.value.byteLength;
			if (size > JSON_LIMIT) throw tooLarge();
			chunks.push(part.value);
		}
	} finally {
		reader?.releaseLock();
	}
	try {
		return new TextDecoder('utf-8', { fatal: true }).decode(Buffer.concat(chunks));
	} catch (cause) {
		throw new AppError('malformed', 'The body is not UTF-8 text.', { cause, mend: 'Send JSON in UTF-8.' });
	}
}

/** @throws AppError wrong-type, too-large or malformed */
export async function readJson(request: Request): Promise<unknown> {
	const type = request.headers.get('content-type')?.split(';')[0].trim().toLowerCase() ?? '';
	if (type !== 'application/json' && !/^application\/[\w.-]+\+json$/.test(type)) {
		throw new AppError(
			'wrong-type',
			`The body is said to be ${type || 'nothing in particular'}; this call takes JSON.`,
			{
				mend: 'Send it with the header Content-Type: application/json.'
			}
		);
	}
	const text = await readText(request);
	try {
		return JSON.parse(text);
	} catch (cause) {
		throw new AppError('malformed', `The body is not JSON: ${(cause as Error).message}.`, { cause });
	}
}
