import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import * as wire from '$lib/api/schemas/shapes';
import type { Box } from '$lib/api/schemas/drawn';
import type { Job } from '$lib/api/schemas/jobs';
import type { RecipeInput } from '$lib/api/schemas/moves';
import type { Shape } from '$lib/api/schemas/shapes';
import { call, newScene, ok, problemIn, storedRows, type Scene } from '../factories/scene';
import { soupOf, soupVolume, writeAsciiSoup, writeBinarySoup, type Soup } from '../factories/stl';
import { csvOf, ellipsoid, predictedChange, sortedAlongX } from '../factories/surfaces';
import { startServer, type TestServer } from '../harness/server';

let server: TestServer;
beforeAll(async () => {
	server = await startServer();
});
afterAll(() => server.stop());

/** The yardstick's map, on coordinates in metres. */
const density = (x: number, y: number, z: number) => Math.cos(3 * x) * Math.sin(2 * y + 0.4) + 0.3 * z;

interface Prepared {
	scene: Scene;
	shape: Shape;
	box: Box;
	recipe: RecipeInput;
	soup: Soup;
}

/** The yardstick's study at a subdivision level: ellipsoid, map, one box; in metres. */
async function yardstick(level: number, sorted = false): Promise<Prepared> {
	const scene = await newScene(server, 'm');
	const mesh = ellipsoid(level, [2.4, 0.9, 0.7]);
	const soup = soupOf(mesh.positions, sorted ? sortedAlongX(mesh).triangles : mesh.triangles);
	const shape = await scene.importShape(writeBinarySoup(soup), 'ellipsoid.stl');
	await scene.importMap(shape.id, csvOf(soup, density));
	const box = await scene.addBox({
		name: 'Nose',
		centre: [1.3, 0, 0.1],
		halfSize: [1.2, 1, 0.9],
		lattice: [7, 7, 7],
		held: { u0: 2, u1: 0, v0: 0, v1: 0, w0: 0, w1: 0 }
	});
	const recipe: RecipeInput = {
		boxIds: [box.id],
		step: 0.01,
		smoothing: 0.05,
		constraints: [{ kind: 'volume', bound: 'hold' }]
	};
	return { scene, shape, box, recipe, soup };
}

/** Corners outside the box (of the standard box): their bits must be the parent's. */
function compare(parent: Soup, child: Soup, inBox: (x: number, y: number, z: number) => boolean) {
	const before = new Uint32Array(parent.corners.buffer, parent.corners.byteOffset, parent.corners.length);
	const after = new Uint32Array(child.corners.buffer, child.corners.byteOffset, child.corners.length);
	let outside = 0;
	let outsideChanged = 0;
	let largest = 0;
	for (let at = 0; at < before.length; at += 3) {
		const [x, y, z] = parent.corners.subarray(at, at + 3);
		largest = Math.max(
			largest,
			Math.hypot(child.corners[at] - x, child.corners[at + 1] - y, child.corners[at + 2] - z)
		);
		if (inBox(x, y, z)) continue;
		outside++;
		if ([0, 1, 2].some((c) => before[at + c] !== after[at + c])) outsideChanged++;
	}
	return { outside, outsideChanged, largest };
}
const inStandardBox = (x: number, y: number, z: number) =>
	Math.abs(x - 1.3) <= 1.2 && Math.abs(y) <= 1 && Math.abs(z - 0.1) <= 0.9;

describe('POST /api/shapes/{id}/moves/preview', () => {
	it('reproduces the yardstick’s figures', async () => {
		const { scene, shape, recipe } = await yardstick(5);
		const answer = await scene.preview(shape.id, recipe);
		// Source: the same workload in NumPy and SciPy (the design's reference program, subdivision level 5).
		expect(shape.volume! / 6.330025727858646).toBeCloseTo(1, 6);
		expect(answer.insideVertices).toBe(4867);
		expect(answer.predicted[0].change! / -0.020573552180878828).toBeCloseTo(1, 5);
		expect(answer.rmsDisplacement / 0.00444359978185834).toBeCloseTo(1, 5);
		expect(answer.maxDisplacement / 0.009980086793364575).toBeCloseTo(1, 5);
		expect(answer.volumeAfter! / answer.volumeBefore!).toBeCloseTo(1, 9);
		expect(answer.lattices).toHaveLength(1);
		expect(answer.lattices[0].displacement).toHaveLength(3 * 343);
		// The first two planes in u (u slowest) are held.
		expect(answer.lattices[0].displacement.slice(0, 3 * 98).every((value) => value === 0)).toBe(true);
		expect(answer.constraints).toHaveLength(1);
		expect(answer.constraints[0]).toMatchObject({ kind: 'volume', bound: 'hold', active: true, unit: 'm³' });
		expect(Math.abs(answer.constraints[0].price!)).toBeGreaterThan(0);
		expect(answer.checks).not.toEqual({});
		expect(Object.values(answer.checks).every(({ ok: fine }) => fine)).toBe(true);
		expect(answer.caution).toMatch(/first.order/i);
	});

	it('stores nothing, and a viewer may ask', async () => {
		const { scene, shape, recipe } = await yardstick(3);
		const viewer = await scene.member('viewer');
		const before = await storedRows(server);
		const path = `/api/shapes/${shape.id}/moves/preview`;
		const mine = await scene.preview(shape.id, recipe);
		expect(await ok(server, viewer.token, 'POST', path, recipe, 200)).toEqual(mine);
		expect(await storedRows(server)).toEqual(before);
		problemIn(await call(server, viewer.token, 'POST', `/api/shapes/${shape.id}/moves`, recipe), 403, 'forbidden');
	});

	it('keeps the volume at least or at most, and free without a constraint', async () => {
		const { scene, shape, recipe } = await yardstick(3);
		const free = await scene.preview(shape.id, { ...recipe, constraints: [] });
		const grows = free.volumeAfter! > free.volumeBefore!;
		expect(free.constraints).toEqual([]);
		expect(Math.abs(free.volumeAfter! / free.volumeBefore! - 1)).toBeGreaterThan(1e-6);
		const binding = await scene.preview(shape.id, {
			...recipe,
			constraints: [{ kind: 'volume', bound: grows ? 'atMost' : 'atLeast' }]
		});
		expect(binding.constraints[0].active).toBe(true);
		expect(binding.volumeAfter! / binding.volumeBefore!).toBeCloseTo(1, 9);
		const idle = await scene.preview(shape.id, {
			...recipe,
			constraints: [{ kind: 'volume', bound: grows ? 'atLeast' : 'atMost' }]
		});
		expect(idle.constraints[0]).toMatchObject({ active: false });
		expect(idle.predicted[0].change! / free.predicted[0].change!).toBeCloseTo(1, 6);
		// What is held costs something: the free move promises more.
		expect(free.predicted[0].change!).toBeLessThan(binding.predicted[0].change!);
	});

	it('refuses a recipe that can’t be, naming the field', async () => {
		const { scene, shape, box, recipe } = await yardstick(2);
		const path = `/api/shapes/${shape.id}/moves/preview`;
		const attempt = async (change: object) =>
			problemIn(await call(server, scene.token, 'POST', path, { ...recipe, ...change }), 422);
		const pointersOf = async (change: object) => (await attempt(change)).errors?.map(({ pointer }) => pointer);
		expect(await pointersOf({ boxIds: [] })).toEqual(['/boxIds']);
		expect(await pointersOf({ step: 0 })).toEqual(['/step']);
		expect(await pointersOf({ smoothing: -1 })).toEqual(['/smoothing']);
		expect(await pointersOf({ boxIds: ['00000000-0000-4000-8000-000000000000'] })).toEqual(['/boxIds/0']);
		const other = await newScene(server);
		const foreign = await other.addBox({ centre: [0, 0, 0], halfSize: [1, 1, 1] });
		expect(await pointersOf({ boxIds: [box.id, foreign.id] })).toEqual(['/boxIds/1']);
		const far = await scene.addBox({ name: 'Far', centre: [50, 0, 0], halfSize: [1, 1, 1] });
		const empty = await attempt({ boxIds: [far.id] });
		expect(empty.detail).toContain('Far');
	});

	it('refuses an impossible combination with its reason', async () => {
		const { scene, shape, recipe } = await yardstick(2);
		const answer = await call(server, scene.token, 'POST', `/api/shapes/${shape.id}/moves/preview`, {
			...recipe,
			constraints: [
				{ kind: 'volume', bound: 'atLeast', value: shape.volume! * 1.001 },
				{ kind: 'volume', bound: 'atMost', value: shape.volume! * 0.999 }
			]
		});
		const problem = problemIn(answer, 422);
		expect(problem.detail).toMatch(/volume/i);
	});

	it('says that the map is missing where there is none', async () => {
		const scene = await newScene(server);
		const mesh = ellipsoid(2, [2.4, 0.9, 0.7]);
		const shape = await scene.importShape(writeBinarySoup(soupOf(mesh.positions, mesh.triangles)));
		const box = await scene.addBox({ centre: [1.3, 0, 0], halfSize: [1.2, 1, 1] });
		const answer = await call(server, scene.token, 'POST', `/api/shapes/${shape.id}/moves/preview`, {
			boxIds: [box.id],
			step: 0.01
		});
		expect(problemIn(answer, 422, 'no-map').detail).toMatch(/sensitivity map/);
	});
});

describe('POST /api/shapes/{id}/moves', () => {
	it('makes two cycles: volume held, outside untouched, prediction as computed here', async () => {
		const { scene, shape, recipe, soup } = await yardstick(5);
		await scene.addResult(shape.id, 44.8, 0.3);
		const preview = await scene.preview(shape.id, recipe);

		const first = await scene.move(shape.id, { ...recipe, name: 'Blunter' });
		expect(first.predicted).toEqual(preview.predicted);
		expect(first.maxDisplacement).toBe(preview.maxDisplacement);
		const child = await scene.shape(first.shapeId);
		expect(wire.shape.parse(child)).toEqual(child);
		expect(child).toMatchObject({
			number: 1,
			parentId: shape.id,
			name: 'Blunter',
			state: 'open',
			topologyId: shape.topologyId,
			step: 0.01,
			smoothing: 0.05,
			predicted: first.predicted,
			closed: true
		});

		const moved = await scene.soup(child.id);
		expect(moved.corners).toHaveLength(soup.corners.length);
		const { outside, outsideChanged, largest } = compare(soup, moved, inStandardBox);
		expect(outside).toBeGreaterThan(10_000);
		expect(outsideChanged).toBe(0);
		// Stored positions are float32: 2.4 m resolve to 2.4e-7 m.
		expect(Math.abs(largest - first.maxDisplacement)).toBeLessThan(5e-7);
		expect(Math.abs(soupVolume(moved) / soupVolume(soup) - 1)).toBeLessThan(1e-9);
		const expected = predictedChange(soup, moved, 1, density);
		expect(expected).toBeLessThan(0);
		expect(Math.abs(first.predicted[0].change! / expected - 1)).toBeLessThan(1e-5);

		// The second cycle, from the first one's own map and result.
		await scene.addResult(child.id, 44.8 + 0.85 * first.predicted[0].change!, 0.3);
		expect((await scene.shape(child.id)).state).toBe('judged');
		const later = (x: number, y: number, z: number) => 0.8 * density(x, y, z) + 0.1 * y;
		await scene.importMap(child.id, csvOf(moved, later));
		const second = await scene.move(child.id, { ...recipe, step: 0.005 });
		const grandchild = await scene.shape(second.shapeId);
		expect(grandchild).toMatchObject({ number: 2, parentId: child.id });
		const again = await scene.soup(grandchild.id);
		expect(compare(moved, again, inStandardBox).outsideChanged).toBe(0);
		expect(Math.abs(soupVolume(again) / soupVolume(moved) - 1)).toBeLessThan(1e-9);
		expect(Math.abs(second.predicted[0].change! / predictedChange(moved, again, 1, later) - 1)).toBeLessThan(1e-5);

		const list = await ok<wire.ShapeSummary[]>(server, scene.token, 'GET', `/api/studies/${scene.study.id}/shapes`);
		expect(list.map(({ number, parentId }) => [number, parentId])).toEqual([
			[0, null],
			[1, shape.id],
			[2, child.id]
		]);
		// ASCII holds the same floats.
		expect([...(await scene.soup(child.id, 'ascii')).corners]).toEqual([...moved.corners]);
	});

	it('keeps the complete recipe, which reproduces the child bit for bit', async () => {
		const { scene, shape, box, recipe } = await yardstick(3);
		const first = await scene.move(shape.id, { boxIds: recipe.boxIds, step: 0.01 });
		const { recipe: kept } = await scene.shape(first.shapeId);
		expect(kept).toMatchObject({
			mode: 'lattice',
			step: 0.01,
			smoothing: 0,
			weights: { [scene.objective.id]: 1 },
			constraints: [{ kind: 'volume', bound: 'hold' }],
			boxIds: [box.id]
		});
		expect(kept!.boxes).toEqual([box]);
		expect(kept!.mapIds).toHaveLength(1);
		expect(kept!.engine).toMatch(/./);
		const { boxIds, mode, step, smoothing, weights, constraints } = kept!;
		const second = await scene.move(shape.id, { boxIds, mode, step, smoothing, weights, constraints });
		expect(second.shapeId).not.toBe(first.shapeId);
		const [one, two] = [await scene.file(first.shapeId), await scene.file(second.shapeId)];
		expect(Buffer.from(one).equals(two)).toBe(true);
		// Both children of one parent: a branch.
		expect((await scene.shape(second.shapeId)).parentId).toBe(shape.id);
		// The box as it was stays in the recipe when the box changes.
		await ok(server, scene.token, 'PUT', `/api/boxes/${box.id}`, {
			name: 'Nose',
			centre: box.centre,
			halfSize: box.halfSize,
			lattice: [3, 3, 3]
		});
		expect((await scene.shape(first.shapeId)).recipe!.boxes[0]).toMatchObject({ version: 1, lattice: [7, 7, 7] });
	});

	it('shares every chunk of the positions that did not move', async () => {
		// 40,962 vertices in three chunks, ordered along x; the box holds the last ones only.
		const { scene, shape } = await yardstick(6, true);
		const tip = await scene.addBox({
			name: 'Tip',
			centre: [2.2, 0, 0],
			halfSize: [0.5, 1, 1],
			lattice: [5, 4, 4],
			held: { u0: 2, u1: 0, v0: 0, v1: 0, w0: 0, w1: 0 }
		});
		const { shapeId } = await scene.move(shape.id, { boxIds: [tip.id], step: 0.01, smoothing: 0.05 });
		const chunks = async (id: string) =>
			(
				await server.query<{ hash: string }>(
					`SELECT encode(chunk.sha256, 'hex') AS hash FROM shapes
					 JOIN content_chunks AS chunk ON chunk.content_id = shapes.positions_id
					 WHERE shapes.id = $1 ORDER BY chunk.ordinal`,
					[id]
				)
			).map(({ hash }) => hash);
		const [before, after] = [await chunks(shape.id), await chunks(shapeId)];
		// 16384 vertices of 12 bytes a chunk.
		expect(before).toHaveLength(Math.ceil(40_962 / 16_384));
		expect(after.slice(0, 2)).toEqual(before.slice(0, 2));
		expect(after[2]).not.toBe(before[2]);
		const child = await scene.soup(shapeId);
		expect(Math.abs(soupVolume(child) / soupVolume(await scene.soup(shape.id)) - 1)).toBeLessThan(1e-9);
	});

	it('keeps the names of the patches', async () => {
		const scene = await newScene(server, 'mm');
		const mesh = ellipsoid(3, [2400, 900, 700]);
		const soup = soupOf(mesh.positions, mesh.triangles);
		soup.solids = [
			{ name: 'left', triangleCount: 640 },
			{ name: 'right side', triangleCount: 640 }
		];
		const shape = await scene.importShape(new TextEncoder().encode(writeAsciiSoup(soup)));
		await scene.importMap(
			shape.id,
			csvOf(soup, (x, y, z) => density(x / 1000, y / 1000, z / 1000))
		);
		const box = await scene.addBox({ centre: [1.3, 0, 0.1], halfSize: [1.2, 1, 0.9] });
		const { shapeId } = await scene.move(shape.id, { boxIds: [box.id], step: 0.01, smoothing: 0.05 });
		expect((await scene.soup(shapeId, 'ascii')).solids).toEqual(soup.solids);
		// As uploaded: ASCII.
		const plain = new TextDecoder().decode((await scene.file(shapeId, 'stl')).slice(0, 10));
		expect(plain).toBe('solid left');
	});

	it('refuses a move that would break the surface, and keeps nothing of it', async () => {
		const { scene, shape, recipe } = await yardstick(4);
		// Ten metres on a body of one: triangles turn over.
		const wild = { ...recipe, step: 10, smoothing: 0 };
		const preview = await scene.preview(shape.id, wild);
		expect(Object.values(preview.checks).some(({ ok: fine, hard }) => hard && !fine)).toBe(true);
		const before = await storedRows(server);
		const job = await server.job<Job>(await scene.startMove(shape.id, wild), scene.token);
		expect(job).toMatchObject({ state: 'failed', error: { status: 422, code: 'check-failed' } });
		expect(await storedRows(server)).toEqual(before);
	});
});

describe('GET /api/shapes/{id}/files/handover', () => {
	it('is a zip with the STL, the recipe and an account', async () => {
		const { scene, shape, recipe } = await yardstick(2);
		const { shapeId } = await scene.move(shape.id, recipe);
		const { default: JSZip } = await import('jszip');
		const zip = await JSZip.loadAsync(await scene.file(shapeId, 'handover'));
		const names = Object.keys(zip.files);
		const stl = names.find((name) => name.endsWith('.stl'))!;
		const json = names.find((name) => name.endsWith('.json'))!;
		expect(names.length).toBeGreaterThanOrEqual(3);
		expect(Buffer.from(await zip.file(stl)!.async('uint8array')).equals(await scene.file(shapeId, 'stl'))).toBe(true);
		expect(await zip.file(json)!.async('string')).toContain(recipe.boxIds[0]);
	});
});
