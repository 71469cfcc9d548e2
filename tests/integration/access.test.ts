/** Every operation of the contract, called by every kind of caller. A row that is added to the contract is walked by itself. */
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { operations, type OperationName } from '$lib/api/contract';
import type { Access, Operation } from '$lib/api/contract/operation';
import type { Shape } from '$lib/api/schemas/shapes';
import { newScene, ok, sendFile, type Scene } from '../factories/scene';
import { soupOf, writeBinarySoup } from '../factories/stl';
import { csvOf, ellipsoid } from '../factories/surfaces';
import { startServer, type TestServer } from '../harness/server';

type Kind = 'nobody' | 'outsider' | 'viewer' | 'reviewer' | 'engineer' | 'admin';
const KINDS: Kind[] = ['nobody', 'outsider', 'viewer', 'reviewer', 'engineer', 'admin'];
/** The admin of this walk has no part in the study: the right to manage people opens no study. */
const MAY: Record<Access, Kind[]> = {
	public: KINDS,
	user: ['outsider', 'viewer', 'reviewer', 'engineer', 'admin'],
	viewer: ['viewer', 'reviewer', 'engineer'],
	reviewer: ['reviewer', 'engineer'],
	engineer: ['engineer'],
	admin: ['admin']
};

let server: TestServer;
let scene: Scene;
let shape: Shape;
let mapId: string;
let keepOutMesh: string;
let moveRecipe: object;
const tokens = {} as Record<Kind, string | undefined>;
const mesh = ellipsoid(1, [2.4, 0.9, 0.7]);
const soup = soupOf(mesh.positions, mesh.triangles);
const stl = writeBinarySoup(soup);
const csv = csvOf(soup, (x) => x);

beforeAll(async () => {
	server = await startServer();
	scene = await newScene(server);
	shape = await scene.importShape(stl);
	({ mapId } = await scene.importMap(shape.id, csv));
	shape = await scene.shape(shape.id);
	moveRecipe = { boxIds: [await newBox()], step: 0.01, lockIds: [] };
	keepOutMesh = await scene.importKeepOut(stl, 'rail.stl');
	await ok(server, scene.token, 'POST', `/api/studies/${scene.study.id}/objectives`, {
		name: 'Wetted area',
		unit: '',
		sense: 'hold',
		rehearsal: { kind: 'wettedArea' }
	});
	tokens.engineer = scene.token;
	tokens.viewer = (await scene.member('viewer')).token;
	tokens.reviewer = (await scene.member('reviewer')).token;
	tokens.outsider = (await server.addUser()).token;
	tokens.admin = (await server.addUser({ admin: true })).token;
});
afterAll(() => server.stop());

const box = { name: 'Box', centre: [1.3, 0, 0], halfSize: [1.2, 1, 1], lattice: [4, 3, 3] };
let count = 0;
const fresh = (word: string) => `${word} ${count++}`;

const keepOut = { name: 'Rail', geometry: { kind: 'halfSpace', point: [0, 0, 2], normal: [0, 0, -1] } };
const lock = { name: 'Flange', patches: ['whatever'] };

async function newDrawn(path: string, body: object): Promise<string> {
	return (await ok<{ id: string }>(server, scene.token, 'POST', `/api/studies/${scene.study.id}/${path}`, body)).id;
}

async function putAway(path: string, body: object): Promise<string> {
	const id = await newDrawn(path, body);
	await ok(server, scene.token, 'DELETE', `/api/${path}/${id}`);
	return id;
}

async function newBox(): Promise<string> {
	return (await ok<{ id: string }>(server, scene.token, 'POST', `/api/studies/${scene.study.id}/boxes`, box)).id;
}

async function newJob(): Promise<string> {
	const path = `/api/studies/${scene.study.id}/shapes?filename=a.stl`;
	return (await sendFile(server, scene.token, path, stl)).body.jobId;
}

/** A valid call of each operation: path values, query and body; made anew for each caller. */
async function valid(
	name: OperationName,
	kind: Kind
): Promise<{ id?: string; userId?: string; query?: object; body?: object }> {
	switch (name) {
		case 'createStudy':
			return { body: { name: fresh('Study'), lengthUnit: 'm' } };
		case 'updateStudy':
			return { body: { note: 'walked' } };
		case 'putMember':
			return { body: { email: (await server.addUser()).email, role: 'viewer' } };
		case 'removeMember':
			return { userId: (await scene.member('viewer')).id };
		case 'createObjective':
			return { body: { name: fresh('Objective'), unit: 'N', sense: 'hold' } };
		case 'updateObjective':
			return { id: scene.objective.id, body: { weight: 1 } };
		case 'createOperatingPoint':
			return { body: { name: fresh('Point') } };
		case 'createBox':
			return { body: box };
		case 'replaceBox':
			return { id: await newBox(), body: box };
		case 'removeBox':
			return { id: await newBox() };
		case 'restoreBox': {
			const id = await newBox();
			await ok(server, scene.token, 'DELETE', `/api/boxes/${id}`);
			return { id };
		}
		case 'rehearse':
			return { body: {} };
		case 'createKeepOut':
			return { body: keepOut };
		case 'replaceKeepOut':
			return { id: await newDrawn('keep-outs', keepOut), body: keepOut };
		case 'removeKeepOut':
			return { id: await newDrawn('keep-outs', keepOut) };
		case 'restoreKeepOut':
			return { id: await putAway('keep-outs', keepOut) };
		case 'importKeepOut':
			return { query: { filename: 'a.stl' } };
		case 'getKeepOutMesh':
			return { id: keepOutMesh };
		case 'createLock':
			return { body: lock };
		case 'replaceLock':
			return { id: await newDrawn('locks', lock), body: lock };
		case 'removeLock':
			return { id: await newDrawn('locks', lock) };
		case 'restoreLock':
			return { id: await putAway('locks', lock) };
		case 'importShape':
			return { query: { filename: 'a.stl' } };
		case 'importMap':
			return { query: { objectiveId: scene.objective.id, filename: 'a.csv', kind: 'density' } };
		case 'getStl':
			return { query: { encoding: 'binary' } };
		case 'previewMove':
		case 'commitMove':
			return { body: moveRecipe };
		case 'createResult':
			return { body: { objectiveId: scene.objective.id, value: 1 } };
		case 'createToken':
			return { body: { name: 'walk' } };
		case 'revokeToken': {
			const owner = tokens[kind] ?? scene.token;
			return { id: (await ok<{ id: string }>(server, owner, 'POST', '/api/tokens', { name: 'walk' })).id };
		}
		case 'createUser':
			return { body: { email: `${count++}@planish.test`, name: 'Walker', password: 'a password of some length' } };
		case 'updateUser':
			return { id: (await server.addUser()).id, body: { name: 'Walked' } };
		default:
			return {};
	}
}

async function subjectId(operation: Operation): Promise<string> {
	switch (operation.subject) {
		case 'study':
			return scene.study.id;
		case 'shape':
			return shape.id;
		case 'topology':
			return shape.topologyId;
		case 'map':
			return mapId;
		case 'job':
			return newJob();
		default:
			return '';
	}
}

async function callAs(name: OperationName, kind: Kind): Promise<Response> {
	const operation: Operation = operations[name];
	const { id, userId, query, body } = await valid(name, kind);
	const path = operation.path
		.replace('{id}', id ?? (await subjectId(operation)))
		.replace('{userId}', userId ?? '')
		.concat(query ? `?${new URLSearchParams(query as Record<string, string>)}` : '');
	const init = { method: operation.method, token: tokens[kind] };
	if (operation.body === 'bytes') {
		return server.fetch(path, {
			...init,
			headers: { 'content-type': 'application/octet-stream' },
			body: name === 'importMap' ? csv : stl
		});
	}
	return server.fetch(path, { ...init, json: body });
}

/** What a caller who may not is told; a thing in a study that is not theirs does not exist for them. */
function refusal({ access, subject }: Operation, kind: Kind): number {
	if (kind === 'nobody') return 401;
	const ofStudy = !['none', 'user', 'token'].includes(subject);
	return access !== 'admin' && ofStudy && (kind === 'outsider' || kind === 'admin') ? 404 : 403;
}

describe.each(Object.keys(operations) as OperationName[])('%s', (name) => {
	const operation: Operation = operations[name];

	it.each(KINDS)('called by %s', async (kind) => {
		const response = await callAs(name, kind);
		const text = await response.text();
		if (MAY[operation.access].includes(kind)) {
			expect(response.status, text.slice(0, 500)).toBe(operation.status);
		} else {
			expect(response.status, text.slice(0, 500)).toBe(refusal(operation, kind));
			expect(response.headers.get('content-type')).toMatch(/^application\/problem\+json/);
		}
	});
});
