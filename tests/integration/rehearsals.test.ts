/** Rehearsal objectives: a whole cycle with no solver. */
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import type { Job } from '$lib/api/schemas/jobs';
import type { Shape } from '$lib/api/schemas/shapes';
import type { Objective } from '$lib/api/schemas/studies';
import { call, newScene, ok, problemIn, type Scene } from '../factories/scene';
import { soupOf, writeBinarySoup } from '../factories/stl';
import { ellipsoid } from '../factories/surfaces';
import { startServer, type TestServer } from '../harness/server';

let server: TestServer;
let scene: Scene;
let shape: Shape;
beforeAll(async () => {
	server = await startServer();
	scene = await newScene(server, 'm');
	const mesh = ellipsoid(4, [1.6, 1, 1]);
	shape = await scene.importShape(writeBinarySoup(soupOf(mesh.positions, mesh.triangles)), 'spheroid.stl');
});
afterAll(() => server.stop());

const objective = (name: string, sense: string, rehearsal: object) =>
	ok<Objective>(server, scene.token, 'POST', `/api/studies/${scene.study.id}/objectives`, {
		name,
		unit: 'whatever',
		sense,
		rehearsal
	});

async function rehearse(shapeId: string): Promise<Job> {
	const path = `/api/shapes/${shapeId}/rehearsals`;
	const { jobId } = await ok<{ jobId: string }>(server, scene.token, 'POST', path, {}, 202);
	return server.job<Job>(jobId, scene.token);
}

describe('rehearsal objectives', () => {
	it('are refused where the study has none', async () => {
		const answer = await call(server, scene.token, 'POST', `/api/shapes/${shape.id}/rehearsals`, {});
		expect(problemIn(answer, 422, 'invalid').mend).toMatch(/rehearsed/);
	});

	it('post value and map as if a solver had, marked as what they are, and a move follows them', async () => {
		const area = await objective('Wetted area', 'minimise', { kind: 'wettedArea' });
		const volume = await objective('Inside', 'hold', { kind: 'volume' });
		const frontal = await objective('Frontal area', 'hold', { kind: 'frontalArea', direction: [1, 0, 0] });
		expect([area.unit, volume.unit, frontal.unit]).toEqual(['m²', 'm³', 'm²']);
		expect((await rehearse(shape.id)).state).toBe('done');
		const now = await scene.shape(shape.id);
		const value = (id: string) => now.results.find((r) => r.objectiveId === id)!;
		expect(value(area.id)).toMatchObject({ rehearsal: true, uncertainty: null });
		expect(value(area.id).value).toBeCloseTo(shape.area, 9);
		expect(value(volume.id).value).toBeCloseTo(shape.volume!, 9);
		// The shadow of a body of revolution about x, of radius 1, but for its facets: below pi r^2.
		expect(value(frontal.id).value / Math.PI).toBeGreaterThan(0.97);
		expect(value(frontal.id).value / Math.PI).toBeLessThan(1);
		expect(now.maps.map((m) => [m.kind, m.rehearsal, m.report.coverage])).toEqual([
			['vector', true, 1],
			['vector', true, 1],
			['vector', true, 1]
		]);

		const box = await scene.addBox({ centre: [0, 0, 0], halfSize: [1.7, 1.1, 1.1], lattice: [5, 4, 4] });
		const move = await scene.move(shape.id, { boxIds: [box.id], step: 0.02, smoothing: 0.1 });
		const predicted = move.predicted.find((p) => p.objectiveId === area.id)!.change!;
		expect(predicted).toBeLessThan(0);
		expect((await rehearse(move.shapeId)).state).toBe('done');
		const child = await scene.shape(move.shapeId);
		const found = child.results.find((r) => r.objectiveId === area.id)!.value;
		// First order holds at this step, and the held volume is found again.
		expect((found - shape.area) / predicted).toBeGreaterThan(0.9);
		expect((found - shape.area) / predicted).toBeLessThan(1.1);
		expect(child.results.find((r) => r.objectiveId === volume.id)!.value / shape.volume! - 1).toBeCloseTo(0, 9);
	});
});
