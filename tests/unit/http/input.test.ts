import { describe, expect, it } from 'vitest';
import { boxCreate } from '$lib/api/schemas/drawn';
import { mapImportQuery } from '$lib/api/schemas/maps';
import { recipeRequest } from '$lib/api/schemas/moves';
import { studyCreate } from '$lib/api/schemas/studies';
import { AppError } from '$lib/server/errors';
import { JSON_LIMIT, isUuid, readJson, validateBody, validateQuery } from '$lib/server/http/input';

const ID = '9716dc5c-3a02-4cb3-984b-7485e2af0c7b';

function refusal(act: () => unknown): AppError {
	try {
		act();
	} catch (thrown) {
		if (thrown instanceof AppError) return thrown;
		throw thrown;
	}
	throw new Error('It was not refused.');
}

describe('validateBody', () => {
	it('fills in the defaults', () => {
		const box = { name: ' Tail ', centre: [0, 0, 0], halfSize: [1, 1, 1], lattice: [4, 4, 4], held: { u0: 2 } };
		expect(validateBody(boxCreate, box)).toMatchObject({ name: 'Tail', basis: 'bernstein', held: { u0: 2, w1: 0 } });
	});

	it('points at every field that is wrong', () => {
		const box = { name: '', centre: [0, 0, 0], halfSize: [1, 1, -1], lattice: [20, 20, 20], held: { u0: 4 } };
		const { code, errors } = refusal(() => validateBody(boxCreate, box));
		expect(code).toBe('invalid');
		expect(errors!.map(({ pointer }) => pointer).sort()).toEqual(['/halfSize/2', '/held/u0', '/lattice', '/name']);
	});

	it('says what is wrong in words', () => {
		const { errors } = refusal(() =>
			validateBody(studyCreate, { name: '', lengthUnit: 'ft', speed: -1, density: '1' })
		);
		expect(Object.fromEntries(errors!.map(({ pointer, detail }) => [pointer, detail]))).toEqual({
			'/name': 'must not be empty',
			'/lengthUnit': 'must be one of m, mm, cm, in',
			'/speed': 'must be more than 0',
			'/density': 'must be number'
		});
		expect(refusal(() => validateBody(studyCreate, { lengthUnit: 'm' })).errors).toEqual([
			{ pointer: '/name', detail: 'is missing' }
		]);
	});

	it('refuses a misspelt field, also deep inside, rather than taking its default', () => {
		const recipe = { boxIds: [ID], step: 0.01 };
		expect(validateBody(recipeRequest, recipe)).toMatchObject({ smoothing: 0 });
		expect(refusal(() => validateBody(recipeRequest, { ...recipe, smothing: 0.05 })).errors).toEqual([
			{ pointer: '/smothing', detail: 'is no field of this call' }
		]);
		const constraints = [{ kind: 'volume', bound: 'atLeast', valeu: 1 }];
		expect(refusal(() => validateBody(recipeRequest, { ...recipe, constraints })).errors).toEqual([
			{ pointer: '/constraints/0/valeu', detail: 'is no field of this call' }
		]);
	});

	it('keeps records whole and escapes their keys in pointers', () => {
		const recipe = { boxIds: [ID], step: 0.01 };
		expect(validateBody(recipeRequest, { ...recipe, weights: { [ID]: 2 } }).weights).toEqual({ [ID]: 2 });
		const { errors } = refusal(() => validateBody(studyCreate, { name: 'A', lengthUnit: 'm', 'a/b~c': 1 }));
		expect(errors![0].pointer).toBe('/a~1b~0c');
	});

	it('refuses what is no object', () => {
		expect(refusal(() => validateBody(studyCreate, null)).code).toBe('invalid');
		expect(refusal(() => validateBody(studyCreate, [1])).code).toBe('invalid');
	});
});

describe('validateQuery', () => {
	const query = (text: string) => new URLSearchParams(text);
	const good = `objectiveId=${ID}&filename=drag.csv&kind=density`;

	it('fills in the defaults', () => {
		expect(validateQuery(mapImportQuery, query(good))).toMatchObject({ location: 'vertex', outward: 'raises' });
	});
	it('refuses a misspelt name: its default could turn a sign', () => {
		expect(refusal(() => validateQuery(mapImportQuery, query(`${good}&outwards=lowers`))).errors![0].pointer).toBe(
			'/outwards'
		);
	});
	it('refuses a name given twice', () => {
		expect(refusal(() => validateQuery(mapImportQuery, query(`${good}&kind=vector`))).errors![0].pointer).toBe('/kind');
	});
});

describe('readJson', () => {
	const post = (body: BodyInit, type = 'application/json') =>
		new Request('http://planish.test/api', { method: 'POST', body, headers: { 'content-type': type } });

	it('reads JSON, also with a charset and as a +json type', async () => {
		expect(await readJson(post('{"a":"µ"}', 'application/json; charset=utf-8'))).toEqual({ a: 'µ' });
		expect(await readJson(post('[1]', 'application/merge-patch+json'))).toEqual([1]);
	});
	it.each([
		['{bad', 'application/json', 'malformed'],
		['', 'application/json', 'malformed'],
		['a=1', 'application/x-www-form-urlencoded', 'wrong-type'],
		['{}', 'text/plain', 'wrong-type']
	])('refuses %j as %s: %s', async (body, type, code) => {
		await expect(readJson(post(body, type))).rejects.toMatchObject({ code });
	});
	it('refuses text that is not UTF-8', async () => {
		await expect(readJson(post(new Uint8Array([0x22, 0xff, 0x22])))).rejects.toMatchObject({ code: 'malformed' });
	});
	it('reads no further than the limit, whether or not the length was announced', async () => {
		let pulled = 0;
		const endless = new ReadableStream({
			pull(controller) {
				pulled += 65_536;
				controller.enqueue(new Uint8Array(65_536).fill(0x20));
			}
		});
		const request = new Request('http://planish.test/api', {
			method: 'POST',
			body: endless,
			headers: { 'content-type': 'application/json' },
			duplex: 'half'
		} as RequestInit);
		await expect(readJson(request)).rejects.toMatchObject({ code: 'too-large' });
		expect(pulled).toBeLessThan(JSON_LIMIT + 5 * 65_536);
		await expect(readJson(post(' '.repeat(JSON_LIMIT + 1)))).rejects.toMatchObject({ code: 'too-large' });
	});
});

describe('isUuid', () => {
	it('knows one', () => expect(isUuid(ID)).toBe(true));
	it.each(['', 'zzz', ID.slice(1), `${ID}0`, undefined])('refuses %j', (text) => expect(isUuid(text)).toBe(false));
});
