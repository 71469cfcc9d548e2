import { readdirSync, readFileSync } from 'node:fs';
import { join, relative } from 'node:path';
import { describe, expect, it } from 'vitest';
import { operations } from '$lib/api/contract';
import type { Operation } from '$lib/api/contract/operation';
import { openApi } from '$lib/server/http/openapi';

const rows = Object.entries(operations) as [keyof typeof operations, Operation][];
const ROUTES = join(import.meta.dirname, '../../../src/routes');

interface Described {
	operationId: string;
	security: object[];
	parameters: { name: string; in: string; required: boolean; schema: object }[];
	requestBody?: { required: boolean; content: Record<string, { schema?: object }> };
	responses: Record<string, { content?: Record<string, { schema?: object }>; $ref?: string }>;
}
const api = openApi() as {
	openapi: string;
	info: { title: string; version: string };
	paths: Record<string, Record<string, Described>>;
	components: Record<string, Record<string, object>>;
};
const described = (name: string) =>
	Object.values(api.paths)
		.flatMap((methods) => Object.values(methods))
		.find((operation) => operation.operationId === name)!;

describe('the routes and the contract', () => {
	/** `METHOD /api/path operation`, for every handler of every +server.ts under /api. */
	const handlers = readdirSync(join(ROUTES, 'api'), { recursive: true, encoding: 'utf8' })
		.filter((file) => file.endsWith('+server.ts') && !file.startsWith('[...path]'))
		.flatMap((file) => {
			const path = '/' + relative(ROUTES, join(ROUTES, 'api', file, '..')).replaceAll(/\[(\w+)\]/g, '{$1}');
			const source = readFileSync(join(ROUTES, 'api', file), 'utf8');
			return [
				...source.matchAll(/export const (GET|POST|PUT|PATCH|DELETE)\b[^=]*=\s*handle\(\s*operations\.(\w+)/g)
			].map(([, method, name]) => `${method} ${path} ${name}`);
		});
	const exported = readdirSync(join(ROUTES, 'api'), { recursive: true, encoding: 'utf8' })
		.filter((file) => file.endsWith('+server.ts') && !file.startsWith('[...path]'))
		.map((file) => readFileSync(join(ROUTES, 'api', file), 'utf8'))
		.flatMap((source) => [
			...source.matchAll(/export (?:const|function|async function) (GET|POST|PUT|PATCH|DELETE)\b/g)
		]);

	it('agree, one handler for each row', () => {
		expect(handlers.sort()).toEqual(rows.map(([name, { method, path }]) => `${method} ${path} ${name}`).sort());
	});

	it('leave no handler that does not go through handle()', () => {
		expect(exported).toHaveLength(handlers.length);
	});
});

describe('openApi', () => {
	it('is OpenAPI 3.1 and plain JSON', () => {
		expect(api.openapi).toMatch(/^3\.1\.\d+$/);
		expect(api.info.title).toBe('Planish');
		expect(api.info.version).toMatch(/^\d+\.\d+\.\d+/);
		expect(JSON.parse(JSON.stringify(api))).toEqual(api);
	});

	it.each(rows)('describes %s', (name, { method, path, access, status, answer, body, query }) => {
		const operation = api.paths[path][method.toLowerCase()];
		expect(operation.operationId).toBe(name);
		expect(operation.security).toHaveLength(access === 'public' ? 0 : 2);
		expect(Object.keys(operation.responses).sort()).toEqual([String(status), 'default']);
		expect(operation.responses.default.$ref).toBe('#/components/responses/Problem');
		const inPath = operation.parameters.filter((parameter) => parameter.in === 'path');
		expect(inPath.map((parameter) => `{${parameter.name}}`)).toEqual(path.match(/\{\w+\}/g) ?? []);
		expect(inPath.every((parameter) => parameter.required)).toBe(true);
		const inQuery = operation.parameters.filter((parameter) => parameter.in === 'query');
		expect(inQuery.map((parameter) => parameter.name)).toEqual(Object.keys(query?.shape ?? {}));
		const taken = body === undefined ? [] : [body === 'bytes' ? 'application/octet-stream' : 'application/json'];
		expect(Object.keys(operation.requestBody?.content ?? {})).toEqual(taken);
		const given = { bytes: ['application/octet-stream'], events: ['text/event-stream'], none: [] };
		const types = typeof answer === 'string' ? given[answer] : ['application/json'];
		expect(Object.keys(operation.responses[status].content ?? {})).toEqual(types);
	});

	it('describes nothing else', () => {
		expect(Object.values(api.paths).flatMap((methods) => Object.keys(methods))).toHaveLength(rows.length);
	});

	it('refers only to what is there, and keeps nothing that is not referred to', () => {
		const refs = [...JSON.stringify(api).matchAll(/"\$ref":"#\/components\/(\w+)\/([^"]+)"/g)];
		for (const [, kind, name] of refs) expect(api.components[kind], `${kind}/${name}`).toHaveProperty([name]);
		expect([...JSON.stringify(api).matchAll(/"\$ref":/g)]).toHaveLength(refs.length);
		const used = new Set(refs.filter(([, kind]) => kind === 'schemas').map(([, , name]) => name));
		expect(Object.keys(api.components.schemas).sort()).toEqual([...used].sort());
	});

	it('names schemas as the specification allows', () => {
		// OpenAPI 3.1.0, Components Object: keys match ^[a-zA-Z0-9\.\-_]+$.
		for (const name of Object.keys(api.components.schemas)) expect(name).toMatch(/^[a-zA-Z0-9._-]+$/);
	});

	it('lets requests leave out what has a default, and promises it in answers', () => {
		expect(described('createBox').requestBody!.content['application/json'].schema).toEqual({
			$ref: '#/components/schemas/BoxCreate'
		});
		const { BoxCreate, Box, HeldInput, Held } = api.components.schemas as Record<string, { required?: string[] }>;
		expect(BoxCreate.required).not.toContain('held');
		expect(Box.required).toContain('held');
		expect(HeldInput.required ?? []).not.toContain('u0');
		expect(Held.required).toContain('u0');
	});

	it('says that unknown fields of a request are refused, and binds no reader of an answer to today’s fields', () => {
		const { StudyCreate, Study } = api.components.schemas as Record<string, { additionalProperties?: boolean }>;
		expect(StudyCreate.additionalProperties).toBe(false);
		expect(Study.additionalProperties).toBeUndefined();
	});

	it('says which query values are required', () => {
		const required = Object.fromEntries(described('importMap').parameters.map((p) => [p.name, p.required]));
		expect(required).toMatchObject({ objectiveId: true, filename: true, kind: true, location: false, outward: false });
	});
});
