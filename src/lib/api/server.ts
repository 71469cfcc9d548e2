/** For page loads and form actions: the API through the event's `fetch`, its refusals as the page's error or the form's. */
import { error, fail, type ActionFailure, type RequestEvent } from '@sveltejs/kit';
import { parseNumber } from '$lib/format/numbers';
import { ApiProblem, createClient, type ApiClient } from './client';

/** Loads page data; a refusal becomes the page's error with the same status. */
export async function loadFrom<T>(fetcher: typeof fetch, ask: (api: ApiClient) => Promise<T>): Promise<T> {
	try {
		return await ask(createClient(fetcher));
	} catch (cause) {
		if (cause instanceof ApiProblem && cause.status >= 400) error(cause.status, cause.detail || cause.title);
		throw cause;
	}
}

/** What a refused form hands back to its page: which form, what was wrong, and everything that was typed. */
export interface FormFailure {
	form: string;
	/** Everything wrong is said beside a field of the form. */
	beside: boolean;
	title: string;
	detail: string;
	mend: string | undefined;
	/** Errors by field name. */
	fields: Record<string, string>;
	values: Record<string, string>;
}

/** Reads a form's fields, gathers what cannot be read, and throws it all at once. */
export class FormReader {
	readonly values: Record<string, string>;
	#errors: { pointer: string; detail: string }[] = [];

	constructor(data: FormData, secret: readonly string[] = []) {
		this.#data = data;
		this.values = Object.fromEntries(
			[...data].filter((entry): entry is [string, string] => typeof entry[1] === 'string' && !secret.includes(entry[0]))
		);
	}
	#data: FormData;

	text(name: string): string {
		const value = this.#data.get(name);
		return typeof value === 'string' ? value.trim() : '';
	}

	/** A field that need not be filled in. */
	optionalText(name: string): string | undefined {
		return this.text(name) || undefined;
	}

	/** `null` when left empty. */
	number(name: string): number | null {
		const text = this.text(name);
		if (text === '') return null;
		const value = parseNumber(text);
		if (Number.isNaN(value)) this.#errors.push({ pointer: `/${name}`, detail: `“${text}” is not a number` });
		return value;
	}

	has(name: string): boolean {
		return this.#data.has(name);
	}

	refuse(name: string, detail: string) {
		this.#errors.push({ pointer: `/${name}`, detail });
	}

	/** Call before anything is sent. */
	check() {
		if (this.#errors.length === 0) return;
		throw new ApiProblem({
			type: 'about:blank',
			title: 'Some fields need another look',
			status: 400,
			code: 'invalid',
			detail: '',
			errors: this.#errors
		});
	}
}

/** Runs one named form action. A refusal of the reader or of the API becomes `fail` with what was typed, secrets left out. */
export async function answerForm<T>(
	event: RequestEvent,
	form: string,
	act: (api: ApiClient, fields: FormReader) => Promise<T>,
	secret: readonly string[] = []
): Promise<T | ActionFailure<FormFailure>> {
	const fields = new FormReader(await event.request.formData(), secret);
	try {
		return await act(createClient(event.fetch), fields);
	} catch (cause) {
		if (!(cause instanceof ApiProblem) || cause.status < 400) throw cause;
		return fail(cause.status, {
			form,
			beside:
				cause.code === 'invalid' && cause.errors.length > 0 && Object.keys(cause.fields).every((f) => fields.has(f)),
			title: cause.title,
			detail: cause.detail,
			mend: cause.mend,
			fields: cause.fields,
			values: fields.values
		});
	}
}
