import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import * as commonWire from '$lib/api/schemas/common';
import * as jobsWire from '$lib/api/schemas/jobs';
import type * as shapesWire from '$lib/api/schemas/shapes';
import type { Job } from '$lib/api/schemas/jobs';
import type { RecipeInput } from '$lib/api/schemas/moves';
import type { Shape } from '$lib/api/schemas/shapes';
import { call, newScene, ok, problemIn, sendFile, storedRows, type Scene } from '../factories/scene';
import { soupOf, soupVolume, writeBinarySoup } from '../factories/stl';
import { csvOf, ellipsoid } from '../factories/surfaces';
import { startServer, type TestServer } from '../harness/server';

let server: TestServer;
beforeAll(async () => {
	server = await startServer();
});
afterAll(() => server.stop());

/** Large enough (level 7: 327,680 triangles, 16 MB) that a job can be caught at its work. */
function file(level: number): Uint8Array<ArrayBuffer> {
	const mesh = ellipsoid(level, [2.4, 0.9, 0.7]);
	return writeBinarySoup(soupOf(mesh.positions, mesh.triangles));
}
const importPath = (scene: Scene) => `/api/studies/${scene.study.id}/shapes?filename=part.stl`;
const jobOf = (scene: Scene, id: string) => ok<Job>(server, scene.token, 'GET', `/api/jobs/${id}`);
const ENDED = ['done', 'failed', 'cancelled'];

/** The `data` of each server-sent event (HTML Living Standard, 9.2) until the stream ends. */
async function eventsOf(response: Response): Promise<Job[]> {
	const text = await response.text();
	return text
		.split(/\r?\n\r?\n/)
		.map((event) =>
			event
				.split(/\r?\n/)
				.filter((line) => line.startsWith('data:'))
				.map((line) => line.slice(5).trimStart())
				.join('\n')
		)
		.filter((data) => data !== '')
		.map((data) => JSON.parse(data) as Job);
}

describe('GET /api/jobs/{id}/events', () => {
	it('tells a job’s progress as it happens and ends with it', async () => {
		const scene = await newScene(server);
		const { body } = await sendFile(server, scene.token, importPath(scene), file(6));
		const response = await server.fetch(`/api/jobs/${body.jobId}/events`, { token: scene.token });
		expect(response.status).toBe(200);
		expect(response.headers.get('content-type')).toMatch(/^text\/event-stream/);
		const events = await eventsOf(response);
		for (const event of events) expect(jobsWire.job.parse(event)).toEqual(event);
		expect(events.at(-1)).toMatchObject({ id: body.jobId, kind: 'import-shape', state: 'done', progress: 1 });
		const shares = events.map(({ progress }) => progress);
		expect([...shares].sort((a, b) => a - b)).toEqual(shares);
		// Asked afterwards, it says the end at once.
		const late = await eventsOf(await server.fetch(`/api/jobs/${body.jobId}/events`, { token: scene.token }));
		expect(late.map(({ state }) => state)).toEqual(['done']);
	});

	it('is for members of the study', async () => {
		const scene = await newScene(server);
		const { body } = await sendFile(server, scene.token, importPath(scene), file(1));
		const outsider = await server.addUser();
		problemIn(await call(server, outsider.token, 'GET', `/api/jobs/${body.jobId}`), 404, 'not-found');
		problemIn(await call(server, outsider.token, 'GET', `/api/jobs/${body.jobId}/events`), 404, 'not-found');
		const viewer = await scene.member('viewer');
		await ok(server, viewer.token, 'GET', `/api/jobs/${body.jobId}`);
		problemIn(await call(server, viewer.token, 'POST', `/api/jobs/${body.jobId}/cancel`), 403, 'forbidden');
		await server.job(body.jobId, scene.token);
	});
});

describe('POST /api/jobs/{id}/cancel', () => {
	it('stops an import, of which nothing stays', async () => {
		const scene = await newScene(server);
		const before = await storedRows(server);
		const { body } = await sendFile(server, scene.token, importPath(scene), file(7));
		await ok<Job>(server, scene.token, 'POST', `/api/jobs/${body.jobId}/cancel`, undefined, 200);
		const job = await server.job<Job>(body.jobId, scene.token);
		expect(job.state).toBe('cancelled');
		expect(job.result).toBeUndefined();
		await expect.poll(() => storedRows(server), { timeout: 15_000 }).toEqual(before);
		expect(await ok(server, scene.token, 'GET', `/api/studies/${scene.study.id}/shapes`)).toEqual([]);
		// The next import is not hindered.
		expect((await scene.importShape(file(2))).number).toBe(0);
	});

	it('leaves a job that has ended as it is', async () => {
		const scene = await newScene(server);
		const { body } = await sendFile(server, scene.token, importPath(scene), file(1));
		const ended = await server.job<Job>(body.jobId, scene.token);
		const path = `/api/jobs/${body.jobId}/cancel`;
		expect(await ok<Job>(server, scene.token, 'POST', path, undefined, 200)).toEqual(ended);
		expect((await scene.shape(ended.result!.shapeId as string)).number).toBe(0);
	});
});

describe('the server at work', () => {
	it('answers other calls while a large file is read', async () => {
		const scene = await newScene(server);
		const { body } = await sendFile(server, scene.token, importPath(scene), file(7));
		let answered = 0;
		let state: string;
		do {
			state = (await jobOf(scene, body.jobId)).state;
			answered++;
		} while (!ENDED.includes(state));
		expect(state).toBe('done');
		// Reading takes the worker seconds; an event loop that parsed would have answered once or twice.
		expect(answered).toBeGreaterThan(10);
	});
});

describe('a server that is killed', () => {
	/** A parent with a map and a recipe whose move takes a while. */
	async function prepared(): Promise<{ scene: Scene; shape: Shape; recipe: RecipeInput }> {
		const scene = await newScene(server);
		const mesh = ellipsoid(6, [2.4, 0.9, 0.7]);
		const soup = soupOf(mesh.positions, mesh.triangles);
		const shape = await scene.importShape(writeBinarySoup(soup));
		await scene.importMap(
			shape.id,
			csvOf(soup, (x, y, z) => Math.cos(3 * x) * Math.sin(2 * y + 0.4) + 0.3 * z)
		);
		const box = await scene.addBox({
			centre: [1.3, 0, 0.1],
			halfSize: [1.2, 1, 0.9],
			lattice: [9, 9, 9],
			held: { u0: 2, u1: 0, v0: 0, v1: 0, w0: 0, w1: 0 }
		});
		return { scene, shape, recipe: { boxIds: [box.id], step: 0.01, smoothing: 0.05 } };
	}

	it('in the middle of a move: the shape appears once and whole, or the job fails cleanly', async () => {
		const { scene, shape, recipe } = await prepared();
		const jobId = await scene.startMove(shape.id, recipe);
		await expect
			.poll(async () => (await jobOf(scene, jobId)).state, { interval: 20, timeout: 30_000 })
			.not.toBe('queued');
		await server.killAndRestart();
		const job = await server.job<Job>(jobId, scene.token, 100);
		expect(['done', 'failed']).toContain(job.state);
		const shapes = await ok<shapesWire.ShapeSummary[]>(
			server,
			scene.token,
			'GET',
			`/api/studies/${scene.study.id}/shapes`
		);
		expect(shapes.map(({ number }) => number)).toEqual(job.state === 'done' ? [0, 1] : [0]);
		if (job.state === 'done') {
			const child = await scene.soup(shapes[1].id);
			const parent = await scene.soup(shape.id);
			expect(child.corners).toHaveLength(parent.corners.length);
			expect(Math.abs(soupVolume(child) / soupVolume(parent) - 1)).toBeLessThan(1e-9);
			expect(job.result!.shapeId).toBe(shapes[1].id);
		} else {
			expect(commonWire.problem.parse(job.error).detail).toMatch(/./);
		}
		// Made again, it is the same shape: running a recipe twice changes nothing.
		const again = await scene.move(shape.id, recipe);
		const others = shapes.slice(1).map(({ id }) => id);
		for (const id of others) {
			expect(Buffer.from(await scene.file(id)).equals(await scene.file(again.shapeId))).toBe(true);
		}
		expect((await scene.shape(again.shapeId)).number).toBe(shapes.length);
	});

	it('keeps everything that was committed', async () => {
		const { scene, shape, recipe } = await prepared();
		const { shapeId } = await scene.move(shape.id, recipe);
		await scene.addResult(shapeId, 41.5);
		const before = [await scene.shape(shape.id), await scene.shape(shapeId)];
		const bytes = await scene.file(shapeId);
		await server.killAndRestart();
		expect([await scene.shape(shape.id), await scene.shape(shapeId)]).toEqual(before);
		expect(Buffer.from(await scene.file(shapeId)).equals(bytes)).toBe(true);
	});
});
