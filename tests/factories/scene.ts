/** A study with its people on a server under test, and the calls that most tests begin with. */
import { expect } from 'vitest';
import type { z } from 'zod';
import type { Problem, Role } from '$lib/api/schemas/common';
import type { Box, BoxCreate } from '$lib/api/schemas/drawn';
import type { Job, mapImported } from '$lib/api/schemas/jobs';
import type { Result } from '$lib/api/schemas/maps';
import type { MoveAnswer, RecipeInput } from '$lib/api/schemas/moves';
import type { Shape } from '$lib/api/schemas/shapes';
import type { Objective, Study } from '$lib/api/schemas/studies';
import type { TestServer, TestUser } from '../harness/server';
import { readSoup, type Soup } from './stl';

export interface Answered<T> {
	status: number;
	body: T;
	headers: Headers;
}

/** Who calls: a bearer token, or null for nobody. */
export type Bearer = string | null;

type Method = 'GET' | 'POST' | 'PUT' | 'PATCH' | 'DELETE';

export async function call<T = unknown>(
	server: TestServer,
	token: Bearer,
	method: Method,
	path: string,
	json?: unknown
): Promise<Answered<T>> {
	const response = await server.fetch(path, { method, token: token ?? undefined, json });
	const text = await response.text();
	return { status: response.status, body: (text ? JSON.parse(text) : undefined) as T, headers: response.headers };
}

/** The answer's body if it has the expected status, else a failure that shows what came. */
export async function ok<T>(
	server: TestServer,
	token: Bearer,
	method: Method,
	path: string,
	json?: unknown,
	status?: number
): Promise<T> {
	const answer = await call<T>(server, token, method, path, json);
	const expected = status ?? (method === 'POST' ? 201 : 200);
	if (answer.status !== expected) {
		throw new Error(`${method} ${path}: ${answer.status} instead of ${expected}: ${JSON.stringify(answer.body)}`);
	}
	return answer.body;
}

/** Checks that an answer is a whole RFC 9457 problem of this status and code, and returns it. */
export function problemIn(answer: Answered<unknown>, status: number, code?: string): Problem {
	const problem = answer.body as Problem;
	expect(answer.status, JSON.stringify(problem)).toBe(status);
	expect(answer.headers.get('content-type')).toMatch(/^application\/problem\+json/);
	expect(problem).toMatchObject({
		type: expect.stringMatching(/./),
		title: expect.stringMatching(/./),
		status,
		detail: expect.stringMatching(/./),
		code: expect.stringMatching(/^[a-z-]+$/)
	});
	if (code) expect(problem.code).toBe(code);
	return problem;
}

export async function sendFile(
	server: TestServer,
	token: Bearer,
	path: string,
	file: Uint8Array<ArrayBuffer> | string
): Promise<Answered<{ jobId: string }>> {
	// Making a large file may have kept this process from seeing that the server closed an idle connection.
	await new Promise((resolve) => setTimeout(resolve, 20));
	const response = await server.fetch(path, {
		method: 'POST',
		token: token ?? undefined,
		headers: { 'content-type': 'application/octet-stream' },
		body: file
	});
	return { status: response.status, body: (await response.json()) as { jobId: string }, headers: response.headers };
}

/** Uploads and waits for the job. */
export async function upload(
	server: TestServer,
	token: string,
	path: string,
	file: Uint8Array<ArrayBuffer> | string
): Promise<Job> {
	const accepted = await sendFile(server, token, path, file);
	expect(accepted.status, JSON.stringify(accepted.body)).toBe(202);
	return server.job<Job>(accepted.body.jobId, token);
}

function resultOf<T>(job: Job): T {
	if (job.state !== 'done') throw new Error(`The job ended ${job.state}: ${JSON.stringify(job.error)}`);
	return job.result as T;
}

export class Scene {
	constructor(
		readonly server: TestServer,
		readonly engineer: TestUser,
		readonly study: Study,
		readonly objective: Objective
	) {}

	get token(): string {
		return this.engineer.token;
	}

	/** A member of the study with that role. */
	async member(role: Role): Promise<TestUser> {
		const user = await this.server.addUser();
		await ok(this.server, this.token, 'PUT', `/api/studies/${this.study.id}/members`, { email: user.email, role });
		return user;
	}

	async importShape(file: Uint8Array<ArrayBuffer> | string, filename = 'part.stl'): Promise<Shape> {
		const path = `/api/studies/${this.study.id}/shapes?filename=${encodeURIComponent(filename)}`;
		const { shapeId } = resultOf<{ shapeId: string }>(await upload(this.server, this.token, path, file));
		return this.shape(shapeId);
	}

	shape(id: string): Promise<Shape> {
		return ok<Shape>(this.server, this.token, 'GET', `/api/shapes/${id}`);
	}

	mapPath(shapeId: string, query: Record<string, string> = {}): string {
		const all = { objectiveId: this.objective.id, filename: 'map.csv', kind: 'density', ...query };
		return `/api/shapes/${shapeId}/sensitivities?${new URLSearchParams(all)}`;
	}

	async importMap(
		shapeId: string,
		csv: string,
		query: Record<string, string> = {}
	): Promise<z.infer<typeof mapImported>> {
		return resultOf(await upload(this.server, this.token, this.mapPath(shapeId, query), csv));
	}

	addBox(box: Partial<BoxCreate> & Pick<BoxCreate, 'centre' | 'halfSize'>): Promise<Box> {
		return ok<Box>(this.server, this.token, 'POST', `/api/studies/${this.study.id}/boxes`, {
			name: 'Box',
			lattice: [5, 4, 4],
			...box
		});
	}

	/** Uploads a closed surface as keep-out. @returns its id */
	async importKeepOut(
		file: Uint8Array<ArrayBuffer>,
		filename: string,
		query: Record<string, string> = {}
	): Promise<string> {
		const path = `/api/studies/${this.study.id}/keep-outs/mesh?${new URLSearchParams({ filename, ...query })}`;
		return resultOf<{ keepOutId: string }>(await upload(this.server, this.token, path, file)).keepOutId;
	}

	/** Draws a keep-out or a lock. */
	draw<T = { id: string }>(what: 'keep-outs' | 'locks', body: object): Promise<T> {
		return ok<T>(this.server, this.token, 'POST', `/api/studies/${this.study.id}/${what}`, body);
	}

	preview(shapeId: string, recipe: RecipeInput): Promise<MoveAnswer> {
		return ok<MoveAnswer>(this.server, this.token, 'POST', `/api/shapes/${shapeId}/moves/preview`, recipe, 200);
	}

	async startMove(shapeId: string, recipe: RecipeInput & { name?: string }): Promise<string> {
		const path = `/api/shapes/${shapeId}/moves`;
		return (await ok<{ jobId: string }>(this.server, this.token, 'POST', path, recipe, 202)).jobId;
	}

	async move(
		shapeId: string,
		recipe: RecipeInput & { name?: string }
	): Promise<MoveAnswer & { shapeId: string; moveId: string }> {
		const jobId = await this.startMove(shapeId, recipe);
		return resultOf(await this.server.job<Job>(jobId, this.token));
	}

	addResult(shapeId: string, value: number, uncertainty?: number): Promise<Result> {
		return ok<Result>(this.server, this.token, 'POST', `/api/shapes/${shapeId}/results`, {
			objectiveId: this.objective.id,
			value,
			uncertainty
		});
	}

	async file(shapeId: string, name = 'stl?encoding=binary'): Promise<Uint8Array<ArrayBuffer>> {
		const response = await this.server.fetch(`/api/shapes/${shapeId}/files/${name}`, { token: this.token });
		if (response.status !== 200) throw new Error(`${name}: ${response.status} ${await response.text()}`);
		return new Uint8Array(await response.arrayBuffer());
	}

	async soup(shapeId: string, encoding: 'binary' | 'ascii' = 'binary'): Promise<Soup> {
		return readSoup(await this.file(shapeId, `stl?encoding=${encoding}`));
	}
}

/** A fresh engineer with a study of one objective to minimise. */
export async function newScene(server: TestServer, lengthUnit: Study['lengthUnit'] = 'm'): Promise<Scene> {
	const engineer = await server.addUser();
	const study = await ok<Study>(server, engineer.token, 'POST', '/api/studies', { name: 'Test study', lengthUnit });
	const objective = await ok<Objective>(server, engineer.token, 'POST', `/api/studies/${study.id}/objectives`, {
		name: 'Drag',
		unit: 'N',
		sense: 'minimise',
		weight: 1
	});
	return new Scene(server, engineer, study, objective);
}

/** Rows in each table that an import or a move writes: what must not grow when one fails. */
export async function storedRows(server: TestServer): Promise<Record<string, number>> {
	const tables = ['blobs', 'contents', 'content_chunks', 'topologies', 'shapes', 'maps', 'moves', 'results'];
	const counts = await server.query<{ name: string; count: string }>(
		tables.map((table) => `SELECT '${table}' AS name, count(*) AS count FROM ${table}`).join(' UNION ALL ')
	);
	return Object.fromEntries(counts.map(({ name, count }) => [name, Number(count)]));
}
