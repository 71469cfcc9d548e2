import { describe, expect, it } from 'vitest';
import { problem as problemSchema } from '$lib/api/schemas/common';
import { MorphError } from '$lib/morph';
import { AppError, errorCodes, statusOf, toProblem } from '$lib/server/errors';
import { problemResponse } from '$lib/server/http/problem';

describe('toProblem', () => {
	it.each(errorCodes)('gives %s a complete problem', (code) => {
		const problem = toProblem(new AppError(code, 'What is wrong.'));
		expect(problemSchema.parse(problem)).toEqual(problem);
		expect(problem).toMatchObject({ code, status: statusOf(code), detail: 'What is wrong.' });
		expect(problem.type).toBe(`urn:planish:problem:${code}`);
		expect(problem.status).toBeGreaterThanOrEqual(400);
	});

	it('carries the mend and the fields', () => {
		const errors = [{ pointer: '/name', detail: 'must not be empty' }];
		expect(toProblem(new AppError('invalid', 'No.', { mend: 'Fill it in.', errors }))).toMatchObject({
			mend: 'Fill it in.',
			errors
		});
	});

	it('takes over what the engine refuses, with the field of the recipe', () => {
		const refused = new MorphError('constraint-invalid', 'Constraint 2 has no bound.', 'Give one.', { constraint: 1 });
		expect(toProblem(refused)).toMatchObject({
			code: 'invalid',
			status: 422,
			detail: 'Constraint 2 has no bound.',
			mend: 'Give one.',
			errors: [{ pointer: '/constraints/1', detail: 'Constraint 2 has no bound.' }]
		});
		const cut = new MorphError('stl-truncated', 'pod.stl ends in triangle 12.', 'Export it again.', { triangle: 12 });
		expect(toProblem(cut)).toMatchObject({ code: 'bad-file', status: 422, mend: 'Export it again.' });
	});

	it('keeps the details of an unexpected error to itself and gives it a number of its own', () => {
		const thrown = new Error('connect to 10.1.2.3 with password hunter2');
		const [first, second] = [toProblem(thrown), toProblem(thrown)];
		expect(first.code).toBe('internal');
		expect(JSON.stringify(first)).not.toMatch(/hunter2|10\.1\.2\.3/);
		expect(first.detail).toMatch(/[0-9a-f]{8}-[0-9a-f-]{27}/);
		expect(second.detail).not.toBe(first.detail);
	});

	it('says that the database is away', () => {
		const lost = Object.assign(new Error('connect ECONNREFUSED'), { name: 'SequelizeConnectionRefusedError' });
		expect(toProblem(lost)).toMatchObject({ code: 'unavailable', status: 503 });
	});
});

describe('problemResponse', () => {
	it('answers problem+json that nobody keeps', async () => {
		const response = problemResponse(new AppError('not-found', 'No such shape.'));
		expect(response.status).toBe(404);
		expect(response.headers.get('content-type')).toBe('application/problem+json');
		expect(response.headers.get('cache-control')).toBe('no-store');
		expect(await response.json()).toMatchObject({ code: 'not-found' });
	});

	it('asks for a token, and says when to try again', () => {
		expect(problemResponse(new AppError('unauthenticated', 'Who?')).headers.get('www-authenticate')).toMatch(/^Bearer/);
		const limited = problemResponse(new AppError('too-many-requests', 'Wait.', { retryAfter: 12.2 }));
		expect(limited.headers.get('retry-after')).toBe('13');
	});
});
