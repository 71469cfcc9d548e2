import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import type * as commonWire from '$lib/api/schemas/common';
import * as drawnWire from '$lib/api/schemas/drawn';
import * as studiesWire from '$lib/api/schemas/studies';
import type { Box } from '$lib/api/schemas/drawn';
import type { Member } from '$lib/api/schemas/people';
import type { Objective, OperatingPoint, Study, StudySummary } from '$lib/api/schemas/studies';
import { call, newScene, ok, problemIn, type Scene } from '../factories/scene';
import { startServer, type TestServer } from '../harness/server';

let server: TestServer;
let scene: Scene;
beforeAll(async () => {
	server = await startServer();
	scene = await newScene(server);
});
afterAll(() => server.stop());

const NOWHERE = '00000000-0000-4000-8000-000000000000';
const pointers = (problem: commonWire.Problem) => problem.errors?.map((error) => error.pointer).sort();

describe('GET /api/health and /api/openapi.json', () => {
	it('answers without a session', async () => {
		expect(await ok(server, null, 'GET', '/api/health')).toEqual({ status: 'ok' });
		const description = await ok<{ openapi: string; paths: Record<string, unknown> }>(
			server,
			null,
			'GET',
			'/api/openapi.json'
		);
		// OpenAPI Specification 3.1.
		expect(description.openapi).toMatch(/^3\.1\./);
		expect(Object.keys(description.paths)).toContain('/api/shapes/{id}/moves/preview');
	});

	it('answers an unknown call with a problem', async () => {
		problemIn(await call(server, scene.token, 'GET', '/api/nothing-here'), 404);
	});
});

describe('POST /api/studies', () => {
	it('makes a study with its maker as engineer and an operating point', async () => {
		const study = await ok<Study>(server, scene.token, 'POST', '/api/studies', {
			name: '  Front wing  ',
			lengthUnit: 'mm',
			referenceArea: 1.25,
			density: 1.225,
			speed: 50
		});
		expect(studiesWire.study.parse(study)).toEqual(study);
		expect(study).toMatchObject({
			name: 'Front wing',
			lengthUnit: 'mm',
			referenceArea: 1.25,
			density: 1.225,
			speed: 50,
			role: 'engineer',
			shapeCount: 0,
			invented: false,
			objectives: [],
			boxes: []
		});
		expect(study.operatingPoints.length).toBeGreaterThanOrEqual(1);
		expect(await ok<Study>(server, scene.token, 'GET', `/api/studies/${study.id}`)).toEqual(study);
		const list = await ok<StudySummary[]>(server, scene.token, 'GET', '/api/studies');
		expect(list.map(({ id }) => id)).toContain(study.id);
	});

	it('points to every field at fault', async () => {
		const answer = await call(server, scene.token, 'POST', '/api/studies', {
			name: ' ',
			lengthUnit: 'furlong',
			referenceArea: -1
		});
		expect(pointers(problemIn(answer, 422, 'invalid'))).toEqual(['/lengthUnit', '/name', '/referenceArea']);
	});

	it('refuses a field that it does not know instead of dropping it', async () => {
		const answer = await call(server, scene.token, 'POST', '/api/studies', {
			name: 'Wing',
			lengthUnit: 'm',
			refArea: 2
		});
		expect(pointers(problemIn(answer, 422, 'invalid'))).toEqual(['/refArea']);
	});

	it('refuses what is not JSON, and what is not said to be', async () => {
		const send = (body: string, type: string) =>
			server.fetch('/api/studies', {
				method: 'POST',
				token: scene.token,
				headers: { 'content-type': type },
				body
			});
		const answered = async (response: Response) => ({
			status: response.status,
			headers: response.headers,
			body: (await response.json()) as unknown
		});
		problemIn(await answered(await send('{"name":', 'application/json')), 400, 'malformed');
		problemIn(await answered(await send('name=Wing', 'text/plain')), 415, 'wrong-type');
		const long = JSON.stringify({ name: 'x'.repeat(2_500_000), lengthUnit: 'm' });
		problemIn(await answered(await send(long, 'application/json')), 413, 'too-large');
	});

	it('refuses a caller without a session or token', async () => {
		const answer = await call(server, null, 'POST', '/api/studies', { name: 'Wing', lengthUnit: 'm' });
		problemIn(answer, 401, 'unauthenticated');
		// RFC 9110, 11.6.1: a 401 names its scheme.
		expect(answer.headers.get('www-authenticate')).toMatch(/^Bearer/);
		problemIn(await call(server, 'not-a-token', 'GET', '/api/studies'), 401);
	});
});

describe('PATCH /api/studies/{id}', () => {
	it('changes what it is given and clears with null', async () => {
		const { study } = await newScene(server);
		const path = `/api/studies/${study.id}`;
		const first = await ok<Study>(server, scene.token, 'POST', '/api/studies', {
			name: 'A',
			lengthUnit: 'm',
			speed: 25
		});
		const changed = await ok<Study>(server, scene.token, 'PATCH', `/api/studies/${first.id}`, {
			name: 'B',
			speed: null,
			note: 'cooled'
		});
		expect(changed).toMatchObject({ name: 'B', speed: null, note: 'cooled', lengthUnit: 'm' });
		problemIn(await call(server, scene.token, 'PATCH', path, { name: 'mine now' }), 404, 'not-found');
		problemIn(await call(server, scene.token, 'PATCH', `/api/studies/${first.id}`, { lengthUnit: 'mm' }), 422);
	});
});

describe('members', () => {
	it('lets people in with a role, changes it, and takes them out', async () => {
		const { study, token } = scene;
		const path = `/api/studies/${study.id}/members`;
		const guest = await server.addUser();
		problemIn(await call(server, guest.token, 'GET', `/api/studies/${study.id}`), 404, 'not-found');
		const members = await ok<Member[]>(server, token, 'PUT', path, { email: guest.email, role: 'viewer' });
		expect(members.find(({ userId }) => userId === guest.id)?.role).toBe('viewer');
		expect((await ok<Study>(server, guest.token, 'GET', `/api/studies/${study.id}`)).role).toBe('viewer');
		problemIn(await call(server, guest.token, 'PATCH', `/api/studies/${study.id}`, { name: 'x' }), 403, 'forbidden');
		await ok(server, token, 'PUT', path, { email: guest.email.toUpperCase(), role: 'engineer' });
		await ok(server, guest.token, 'PATCH', `/api/studies/${study.id}`, { note: 'seen' });
		const left = await ok<Member[]>(server, token, 'DELETE', `${path}/${guest.id}`);
		expect(left.map(({ userId }) => userId)).toEqual([scene.engineer.id]);
		problemIn(await call(server, guest.token, 'GET', `/api/studies/${study.id}`), 404);
	});

	it('refuses an unknown person and keeps the last engineer', async () => {
		const path = `/api/studies/${scene.study.id}/members`;
		const unknown = await call(server, scene.token, 'PUT', path, { email: 'nobody@planish.test', role: 'viewer' });
		const problem = problemIn(unknown, unknown.status);
		expect([404, 422]).toContain(unknown.status);
		expect(problem.detail).toContain('nobody@planish.test');
		problemIn(await call(server, scene.token, 'DELETE', `${path}/${scene.engineer.id}`), 409, 'conflict');
		problemIn(
			await call(server, scene.token, 'PUT', path, { email: scene.engineer.email, role: 'viewer' }),
			409,
			'conflict'
		);
		problemIn(await call(server, scene.token, 'PUT', path, { email: 'no address', role: 'boss' }), 422, 'invalid');
	});
});

describe('objectives and operating points', () => {
	it('are made, changed and listed in their order', async () => {
		const { server: _, study, token } = await newScene(server);
		const second = await ok<Objective>(server, token, 'POST', `/api/studies/${study.id}/objectives`, {
			name: 'Downforce',
			unit: 'N',
			sense: 'maximise'
		});
		expect(second).toMatchObject({ name: 'Downforce', sense: 'maximise', weight: 1 });
		await ok<Objective>(server, token, 'PATCH', `/api/objectives/${second.id}`, { sense: 'hold', weight: 0 });
		const point = await ok<OperatingPoint>(server, token, 'POST', `/api/studies/${study.id}/operating-points`, {
			name: 'Yaw 5',
			speed: 30,
			density: 1.2,
			yaw: 5
		});
		expect(point).toMatchObject({ name: 'Yaw 5', speed: 30, yaw: 5, weight: 1 });
		const now = await ok<Study>(server, token, 'GET', `/api/studies/${study.id}`);
		expect(now.objectives.map(({ name, sense, weight }) => [name, sense, weight])).toEqual([
			['Drag', 'minimise', 1],
			['Downforce', 'hold', 0]
		]);
		expect(now.operatingPoints.map(({ name }) => name)).toContain('Yaw 5');
	});

	it('refuse a sense, a weight or a name that can’t be', async () => {
		const path = `/api/studies/${scene.study.id}/objectives`;
		const wrong = await call(server, scene.token, 'POST', path, { name: '', unit: 'N', sense: 'reduce', weight: -1 });
		expect(pointers(problemIn(wrong, 422, 'invalid'))).toEqual(['/name', '/sense', '/weight']);
		const twice = await call(server, scene.token, 'POST', path, { name: 'Drag', unit: 'N', sense: 'minimise' });
		expect([409, 422]).toContain(problemIn(twice, twice.status).status);
		problemIn(await call(server, scene.token, 'PATCH', `/api/objectives/${NOWHERE}`, { weight: 2 }), 404);
	});
});

describe('design boxes', () => {
	const centre: [number, number, number] = [1, 0, 0];
	const halfSize: [number, number, number] = [0.5, 0.4, 0.3];

	it('are made with defaults filled in, versioned, put away and brought back', async () => {
		const { study, token } = scene;
		const box = await ok<Box>(server, token, 'POST', `/api/studies/${study.id}/boxes`, {
			name: 'Tail',
			centre,
			halfSize,
			lattice: [7, 5, 5]
		});
		expect(drawnWire.box.parse(box)).toEqual(box);
		expect(box).toMatchObject({
			basis: 'bernstein',
			rotation: [0, 0, 0, 1],
			axes: ['x', 'y', 'z'],
			frame: 'box',
			held: { u0: 0, u1: 0, v0: 0, v1: 0, w0: 0, w1: 0 },
			version: 1
		});
		const next = await ok<Box>(server, token, 'PUT', `/api/boxes/${box.id}`, {
			name: 'Tail',
			centre,
			halfSize,
			lattice: [9, 5, 5],
			held: { u0: 2, u1: 0, v0: 0, v1: 0, w0: 0, w1: 0 }
		});
		expect(next).toMatchObject({ id: box.id, version: 2, lattice: [9, 5, 5] });
		await ok<Box>(server, token, 'DELETE', `/api/boxes/${box.id}`);
		const without = await ok<Study>(server, token, 'GET', `/api/studies/${study.id}`);
		expect(without.boxes.map(({ id }) => id)).not.toContain(box.id);
		const back = await ok<Box>(server, token, 'POST', `/api/boxes/${box.id}/restore`, undefined, 200);
		expect(back).toMatchObject({ id: box.id, lattice: [9, 5, 5], held: { u0: 2 } });
		const withIt = await ok<Study>(server, token, 'GET', `/api/studies/${study.id}`);
		expect(withIt.boxes.map(({ id }) => id)).toContain(box.id);
	});

	it('refuse what no lattice can be, naming the field', async () => {
		const path = `/api/studies/${scene.study.id}/boxes`;
		const attempt = async (change: object) =>
			pointers(
				problemIn(
					await call(server, scene.token, 'POST', path, {
						name: 'Tail',
						centre,
						halfSize,
						lattice: [5, 5, 5],
						...change
					}),
					422,
					'invalid'
				)
			);
		expect(await attempt({ lattice: [1, 5, 21] })).toEqual(['/lattice/0', '/lattice/2']);
		expect(await attempt({ lattice: [20, 20, 20] })).toEqual(['/lattice']);
		expect(await attempt({ halfSize: [0.5, 0, 0.3] })).toEqual(['/halfSize/1']);
		expect(await attempt({ rotation: [0, 0, 0, 2] })).toEqual(['/rotation']);
		expect(await attempt({ axes: ['x', 'x'] })).toEqual(['/axes']);
		expect(await attempt({ held: { u0: 4 } })).toEqual(['/held/u0']);
		expect(await attempt({ centre: [0, 0] })).toEqual(['/centre']);
	});
});
