/** The OpenAPI 3.1 description, made from the contract and the schemas that validate. */
import { z } from 'zod';
import { operations } from '$lib/api/contract';
import type { Operation } from '$lib/api/contract/operation';
import * as common from '$lib/api/schemas/common';
import * as drawn from '$lib/api/schemas/drawn';
import * as jobs from '$lib/api/schemas/jobs';
import * as maps from '$lib/api/schemas/maps';
import * as moves from '$lib/api/schemas/moves';
import * as people from '$lib/api/schemas/people';
import * as shapes from '$lib/api/schemas/shapes';
import * as studies from '$lib/api/schemas/studies';
import { version } from '../../../../package.json';
import { componentsOf, type JsonSchema } from './openapi-components';

/** Every wire type, under the name that the description gives it. */
const schemas = { ...common, ...drawn, ...jobs, ...maps, ...moves, ...people, ...shapes, ...studies };

const json = (schema: JsonSchema) => ({ 'application/json': { schema } });

function pathParameters({ path, subject }: Operation) {
	return [...path.matchAll(/\{(\w+)\}/g)].map(([, name]) => ({
		name,
		in: 'path',
		required: true,
		description: name === 'id' ? `of the ${subject}` : undefined,
		schema: { type: 'string', format: 'uuid' }
	}));
}

function queryParameters(schema: JsonSchema | undefined) {
	const required = (schema?.required ?? []) as string[];
	return Object.entries((schema?.properties ?? {}) as Record<string, JsonSchema>).map(([name, value]) => {
		const { description, ...rest } = value;
		return { name, in: 'query', required: required.includes(name), description, schema: rest };
	});
}

function requestBody(operation: Operation, schema: JsonSchema | undefined) {
	if (!operation.body) return undefined;
	const content = operation.body === 'bytes' ? { 'application/octet-stream': {} } : json(schema!);
	return { required: true, content };
}

function success(operation: Operation, schema: JsonSchema | undefined) {
	const description = operation.status === 202 ? 'Accepted: follow the job' : 'Done';
	if (operation.answer === 'none') return { description };
	if (operation.answer === 'bytes') return { description, content: { 'application/octet-stream': {} } };
	if (operation.answer === 'events') return { description, content: { 'text/event-stream': {} } };
	return { description, content: json(schema!) };
}

const NEEDS: Record<Operation['access'], string> = {
	public: 'Anybody may call it.',
	user: 'Needs a session or a token.',
	viewer: 'Needs to be viewer, reviewer or engineer of the study.',
	reviewer: 'Needs to be reviewer or engineer of the study.',
	engineer: 'Needs to be engineer of the study.',
	admin: 'Needs to be admin of the installation.'
};

function describe(name: string, operation: Operation, parts: Record<string, JsonSchema>) {
	const isPublic = operation.access === 'public';
	return {
		operationId: name,
		tags: [operation.path.split('/')[2]],
		summary: operation.summary,
		description: NEEDS[operation.access],
		security: isPublic ? [] : [{ token: [] }, { session: [] }],
		parameters: [...pathParameters(operation), ...queryParameters(parts.query)],
		requestBody: requestBody(operation, parts.body),
		responses: {
			[operation.status]: success(operation, parts.answer),
			default: { $ref: '#/components/responses/Problem' }
		}
	};
}

function build(): Record<string, unknown> {
	const rows = Object.entries(operations) as [string, Operation][];
	// Their properties become parameters one by one.
	const queries = new Set<unknown>(rows.map(([, { query }]) => query));
	const { components, inline } = componentsOf(
		Object.entries(schemas).flatMap(([name, value]) =>
			value instanceof z.ZodType && !queries.has(value) ? [[name, value] as const] : []
		),
		rows.flatMap(([name, { query, body, answer }]) => [
			...(query ? [{ key: `${name}.query`, schema: query, io: 'input' as const }] : []),
			...(body instanceof z.ZodType ? [{ key: `${name}.body`, schema: body, io: 'input' as const }] : []),
			...(answer instanceof z.ZodType ? [{ key: `${name}.answer`, schema: answer, io: 'output' as const }] : [])
		]),
		['problem']
	);
	const paths: Record<string, Record<string, unknown>> = {};
	for (const [name, operation] of rows) {
		const parts = { query: inline[`${name}.query`], body: inline[`${name}.body`], answer: inline[`${name}.answer`] };
		(paths[operation.path] ??= {})[operation.method.toLowerCase()] = describe(name, operation, parts);
	}
	return {
		openapi: '3.1.0',
		info: {
			title: 'Planish',
			version,
			description:
				'From a surface sensitivity map to the next cycle’s geometry. SI throughout, lengths in metres; files are in the study’s length unit. Predictions are first order: the solver must confirm them.'
		},
		servers: [{ url: '/' }],
		paths,
		components: {
			schemas: components,
			responses: {
				Problem: {
					description: 'Refused, with the reason (RFC 9457)',
					content: { 'application/problem+json': { schema: { $ref: '#/components/schemas/Problem' } } }
				}
			},
			securitySchemes: {
				token: { type: 'http', scheme: 'bearer', description: 'An API token, made in Planish or with npm run token' },
				session: {
					type: 'apiKey',
					in: 'cookie',
					name: 'planish-session',
					description: 'The browser’s session; the port follows in the name where the address has one'
				}
			}
		}
	};
}

let description: Record<string, unknown> | undefined;

/** Made at the first call, the same ever after. */
export const openApi = (): Record<string, unknown> => (description ??= JSON.parse(JSON.stringify(build())));
