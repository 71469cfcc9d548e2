/**
 * The typed client of the API: one function for each JSON operation of the contract, with the types that the contract's
 * schemas give. Works in the browser and, given SvelteKit's `fetch`, while a page is rendered on the server.
 */
import type { z } from 'zod';
import { operations, type OperationName } from './contract';
import type { Operation } from './contract/operation';
import type { Problem } from './schemas/common';

type Operations = typeof operations;
type JsonName = {
	[K in OperationName]: Operations[K] extends { body: 'bytes' }
		? never
		: Operations[K]['answer'] extends z.ZodType
			? K
			: never;
}[OperationName];

type PathNames<P extends string> = P extends `${string}{${infer N}}${infer Rest}` ? N | PathNames<Rest> : never;
type Path<K extends OperationName> = { [N in PathNames<Operations[K]['path']>]: string };
type Body<K extends OperationName> = Operations[K] extends { body: infer B extends z.ZodType }
	? { body: z.input<B> }
	: unknown;
type Arguments<K extends OperationName> = Path<K> & Body<K> & { signal?: AbortSignal };

/** What an operation answers. */
export type Answer<K extends OperationName> = Operations[K]['answer'] extends infer A extends z.ZodType
	? z.output<A>
	: never;

type NoArguments = { signal?: AbortSignal };
export type ApiClient = {
	[K in JsonName]: NoArguments extends Arguments<K>
		? (args?: Arguments<K>) => Promise<Answer<K>>
		: (args: Arguments<K>) => Promise<Answer<K>>;
};

/** A refusal of the API (RFC 9457), as something that can be thrown and shown. */
export class ApiProblem extends Error {
	override readonly name = 'ApiProblem';
	readonly status: number;
	readonly code: string;
	readonly title: string;
	readonly detail: string;
	readonly mend: string | undefined;
	readonly errors: { pointer: string; detail: string }[];

	constructor(readonly problem: Problem) {
		super(problem.detail || problem.title);
		this.status = problem.status;
		this.code = problem.code;
		this.title = problem.title;
		this.detail = problem.detail;
		this.mend = problem.mend;
		this.errors = problem.errors ?? [];
	}

	/** Errors by field: `{name: '…', 'lattice/0': '…'}`. */
	get fields(): Record<string, string> {
		return Object.fromEntries(this.errors.map((e) => [e.pointer.replace(/^#?\/+/, ''), e.detail]));
	}
}

/** Whatever was thrown as a problem that can be shown. */
export function asProblem(cause: unknown): ApiProblem {
	if (cause instanceof ApiProblem) return cause;
	const offline = cause instanceof TypeError;
	return new ApiProblem({
		type: 'about:blank',
		title: offline ? 'No connection' : 'Something went wrong',
		status: 0,
		code: offline ? 'offline' : 'unexpected',
		detail: offline ? 'The server did not answer.' : cause instanceof Error ? cause.message : String(cause),
		mend: offline ? 'Check the connection and try again. Nothing was changed.' : undefined
	});
}

/** The problem in a failed answer's text; a text that is no problem+json still says status and what came. */
export function problemFromText(status: number, statusText: string, text: string): ApiProblem {
	try {
		const body = JSON.parse(text) as Partial<Problem>;
		if (typeof body.title === 'string') {
			return new ApiProblem({
				type: 'about:blank',
				detail: '',
				code: 'unexpected',
				...body,
				title: body.title,
				status
			});
		}
	} catch {
		// Not JSON: a proxy's page, for example.
	}
	return new ApiProblem({
		type: 'about:blank',
		title: statusText || `Status ${status}`,
		status,
		code: 'unexpected',
		detail: `The server answered ${status}${statusText ? ` (${statusText})` : ''} without saying why.`
	});
}

/** `/api/shapes/{id}/files/stl` with its names filled in and its query appended. */
export function apiPath<K extends OperationName>(
	name: K,
	path: Path<K>,
	query: Record<string, string | undefined> = {}
): string {
	const values = path as Record<string, string>;
	const filled = operations[name].path.replace(/\{(\w+)\}/g, (_, key: string) => encodeURIComponent(values[key]));
	const given = Object.entries(query).filter((entry): entry is [string, string] => entry[1] !== undefined);
	return given.length ? `${filled}?${new URLSearchParams(given)}` : filled;
}

export function createClient(fetcher: typeof fetch = (...args) => fetch(...args)): ApiClient {
	const call = async (name: OperationName, args: Record<string, unknown> = {}) => {
		const operation: Operation = operations[name];
		const { body, signal, ...path } = args;
		const response = await fetcher(apiPath(name, path as Path<OperationName>), {
			method: operation.method,
			signal: signal as AbortSignal | undefined,
			headers: body === undefined ? undefined : { 'content-type': 'application/json' },
			body: body === undefined ? undefined : JSON.stringify(body)
		});
		const text = await response.text();
		if (!response.ok) throw problemFromText(response.status, response.statusText, text);
		return text === '' ? undefined : (JSON.parse(text) as unknown);
	};
	const names = Object.keys(operations) as OperationName[];
	return Object.fromEntries(
		names.map((name) => [name, (args?: Record<string, unknown>) => call(name, args)])
	) as unknown as ApiClient;
}

/** The browser's client. On the server make one from the event's `fetch`: it carries the caller's session. */
export const api = createClient();
