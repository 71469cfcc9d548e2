/** What a move keeps clear of and leaves alone: keep-outs, locks, bounds, symmetry, points moved by hand. */
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import type { Box, KeepOut, Lock } from '$lib/api/schemas/drawn';
import type { Job } from '$lib/api/schemas/jobs';
import type { RecipeInput } from '$lib/api/schemas/moves';
import type { Shape } from '$lib/api/schemas/shapes';
import type { Study } from '$lib/api/schemas/studies';
import { call, newScene, ok, problemIn, upload, type Scene } from '../factories/scene';
import { soupOf, writeAsciiSoup, writeBinarySoup, type Soup } from '../factories/stl';
import { csvOf, ellipsoid } from '../factories/surfaces';
import { startServer, type TestServer } from '../harness/server';

let server: TestServer;
let scene: Scene;
let shape: Shape;
let box: Box;
let recipe: RecipeInput;
let soup: Soup;
const mesh = ellipsoid(4, [2.4, 0.9, 0.7]);

beforeAll(async () => {
	server = await startServer();
	scene = await newScene(server, 'm');
	soup = soupOf(mesh.positions, mesh.triangles);
	shape = await scene.importShape(writeBinarySoup(soup), 'ellipsoid.stl');
	// The surface wants to go outward everywhere, most of all on top.
	await scene.importMap(
		shape.id,
		csvOf(soup, (_x, _y, z) => -1.5 - z)
	);
	shape = await scene.shape(shape.id);
	box = await scene.addBox({
		name: 'Roof',
		centre: [0, 0, 0.4],
		halfSize: [1.5, 0.8, 0.45],
		lattice: [5, 4, 4],
		held: { u0: 1, u1: 1, v0: 1, v1: 1, w0: 1, w1: 0 }
	});
	recipe = { boxIds: [box.id], step: 0.03, smoothing: 0.05, constraints: [] };
});
afterAll(() => server.stop());

const highest = ({ corners }: Soup) => corners.reduce((top, x, i) => (i % 3 === 2 ? Math.max(top, x) : top), -Infinity);
const half = (level: number) => ({ kind: 'halfSpace', point: [0, 0, level], normal: [0, 0, -1] });

describe('keep-outs', () => {
	it('are touched and never crossed, and say their price', async () => {
		const { id } = await scene.draw<KeepOut>('keep-outs', { name: 'Rail', geometry: half(0.712), clearance: 0.002 });
		const free = await scene.move(shape.id, recipe);
		expect(highest(await scene.soup(free.shapeId))).toBeGreaterThan(0.72);
		const kept = await scene.move(shape.id, { ...recipe, constraints: [{ kind: 'keepOut', keepOutId: id }] });
		const top = highest(await scene.soup(kept.shapeId));
		expect(top).toBeLessThanOrEqual(Math.fround(0.71));
		expect(top).toBeGreaterThan(0.7099);
		const [answer] = kept.constraints;
		expect(answer).toMatchObject({
			kind: 'keepOut',
			keepOutId: id,
			name: 'Rail',
			unit: 'm',
			limit: 0.002,
			active: true,
			kept: true
		});
		expect(answer.price).toBeGreaterThan(0);
		expect(answer.after).toBeGreaterThanOrEqual(0.002);
		expect(answer.places).toBeGreaterThan(0);
		const child = await scene.shape(kept.shapeId);
		expect(child.recipe?.keepOuts).toMatchObject([{ id, version: 1, clearance: 0.002 }]);
	});

	it('can be an uploaded surface, whose shape comes back as it was', async () => {
		const beam = ellipsoid(3, [3, 0.2, 0.2]);
		for (let i = 2; i < beam.positions.length; i += 3) beam.positions[i] += 0.915;
		const file = writeBinarySoup(soupOf(beam.positions, beam.triangles));
		const id = await scene.importKeepOut(file, 'beam.stl', { clearance: '0.005' });
		const study = await ok<Study>(server, scene.token, 'GET', `/api/studies/${scene.study.id}`);
		const keepOut = study.keepOuts.find((k) => k.id === id)!;
		expect(keepOut).toMatchObject({
			name: 'beam',
			side: 'outside',
			clearance: 0.005,
			geometry: { kind: 'mesh', triangleCount: 1280 }
		});
		const response = await server.fetch(`/api/keep-outs/${id}/mesh`, { token: scene.token });
		const bytes = await response.arrayBuffer();
		expect([...new Uint32Array(bytes, 0, 2)]).toEqual([642, 1280]);
		expect(bytes.byteLength).toBe(8 + 12 * (642 + 1280));
		const kept = await scene.preview(shape.id, { ...recipe, constraints: [{ kind: 'keepOut', keepOutId: id }] });
		expect(kept.constraints[0]).toMatchObject({ kind: 'keepOut', kept: true, active: true });
		expect(kept.constraints[0].after).toBeGreaterThanOrEqual(0.005);
		const edited = await ok<KeepOut>(server, scene.token, 'PUT', `/api/keep-outs/${id}`, {
			name: 'Beam',
			clearance: 0.001,
			version: 1
		});
		expect(edited).toMatchObject({ name: 'Beam', version: 2, geometry: { kind: 'mesh' } });
		const refused = await call(server, scene.token, 'PUT', `/api/keep-outs/${id}`, { name: 'Beam', geometry: half(1) });
		expect(problemIn(refused, 422).errors?.[0].pointer).toBe('/geometry');
	});

	it('that are open are refused with what is wrong, and nothing is kept', async () => {
		const corners = soup.corners.slice(0, -9);
		const solids = [{ name: 'open', triangleCount: corners.length / 9 }];
		const open = writeAsciiSoup({ ...soup, corners, solids });
		const path = `/api/studies/${scene.study.id}/keep-outs/mesh?filename=open.stl`;
		const job = await upload(server, scene.token, path, open);
		expect(job).toMatchObject({ state: 'failed', error: { code: 'bad-file' } });
		expect(job.error?.detail).toMatch(/open\.stl.*closed.*3 open edges/);
		expect(job.error?.mend).toMatch(/Close it/);
	});

	it('that nothing can keep are named', async () => {
		const { id } = await scene.draw<KeepOut>('keep-outs', { name: 'Ceiling', geometry: half(0.6) });
		const answer = await call(server, scene.token, 'POST', `/api/shapes/${shape.id}/moves/preview`, {
			...recipe,
			constraints: [
				{ kind: 'keepOut', keepOutId: id },
				{ kind: 'displacement', inward: 0.001 }
			]
		});
		expect(problemIn(answer, 422, 'infeasible').detail).toMatch(/Ceiling/);
	});

	it('changed by somebody else in between are not overwritten', async () => {
		const body = { name: 'Door', geometry: half(3) };
		const { id } = await scene.draw<KeepOut>('keep-outs', body);
		await ok(server, scene.token, 'PUT', `/api/keep-outs/${id}`, { ...body, version: 1, clearance: 0.01 });
		const late = await call(server, scene.token, 'PUT', `/api/keep-outs/${id}`, { ...body, version: 1 });
		expect(problemIn(late, 409, 'conflict').detail).toMatch(/version 2/);
	});
});

describe('bounds of the displacement', () => {
	it('hold inward and outward, in a box', async () => {
		const answer = await scene.preview(shape.id, {
			...recipe,
			constraints: [
				{ kind: 'displacement', inward: 0.001, outward: 0.02, boxId: box.id },
				{ kind: 'volume', bound: 'hold' }
			]
		});
		expect(answer.constraints.map((c) => [c.kind, c.bound, c.index, c.kept])).toEqual([
			['displacement', 'atLeast', 0, true],
			['displacement', 'atMost', 0, true],
			['volume', 'hold', 1, true]
		]);
		expect(answer.constraints[0].after).toBeGreaterThanOrEqual(-0.001 - 1e-12);
		expect(answer.constraints[1].after).toBeLessThanOrEqual(0.02 + 1e-12);
	});
});

describe('wall thickness', () => {
	it('is kept along inward rays, and priced', async () => {
		// Outward lowers on top and, more so, below: the sides come towards each other under a held volume.
		const free = await scene.preview(shape.id, { ...recipe, constraints: [{ kind: 'volume', bound: 'hold' }] });
		expect(free.constraints).toHaveLength(1);
		const least = 0.2;
		const kept = await scene.move(shape.id, {
			...recipe,
			constraints: [
				{ kind: 'volume', bound: 'hold' },
				{ kind: 'thickness', least }
			]
		});
		const wall = kept.constraints.find((c) => c.kind === 'thickness')!;
		expect(wall).toMatchObject({ index: 1, unit: 'm', limit: least, bound: 'atLeast', kept: true });
	});
});

describe('checks of the moved surface', () => {
	it('say area ratio and self-intersection of every move, and of what a recipe keeps its own', async () => {
		const { id } = await scene.draw<KeepOut>('keep-outs', { name: 'Lintel', geometry: half(0.72), clearance: 0.001 });
		const plain = await scene.preview(shape.id, recipe);
		expect(Object.keys(plain.checks).sort()).toEqual(['areaRatio', 'flipped', 'minAngle', 'selfIntersection']);
		expect(plain.checks.selfIntersection).toMatchObject({ value: 0, limit: 0, ok: true, hard: true, before: 0 });
		expect(plain.checks.areaRatio).toMatchObject({ unit: '×', ok: true, hard: false });
		const { checks } = await scene.preview(shape.id, {
			...recipe,
			constraints: [
				{ kind: 'keepOut', keepOutId: id },
				{ kind: 'thickness', least: 0.2 },
				{ kind: 'radius', least: 0.01 }
			]
		});
		expect(checks.keepOut).toMatchObject({ limit: 0.001, unit: 'm', ok: true, hard: true, label: 'Lintel' });
		expect(checks.keepOut.value).toBeGreaterThanOrEqual(0.001);
		expect(checks.thickness).toMatchObject({ limit: 0.2, ok: true, hard: true });
		expect(checks.radius).toMatchObject({ limit: 0.01, ok: true, hard: true });
	});

	it('a move that would make an edge sharper than its least radius is shown and not stored', async () => {
		const strict: RecipeInput = { ...recipe, constraints: [{ kind: 'radius', least: 0.9 }] };
		const { checks } = await scene.preview(shape.id, strict);
		expect(checks.radius).toMatchObject({ limit: 0.9, ok: false, hard: true });
		expect(checks.radius.count).toBeGreaterThan(0);
		const job = await server.job<Job>(await scene.startMove(shape.id, strict), scene.token);
		expect(job.state).toBe('failed');
		expect(job.error).toMatchObject({ code: 'check-failed', detail: expect.stringContaining('900 mm') as string });
	});
});

describe('locks', () => {
	it('keep the bits of a patch, and rise over the blend distance', async () => {
		// One solid for the half with x < 0, one for the other: the move is locked out of the first.
		const study = await newScene(server, 'm');
		const left: number[] = [];
		const right: number[] = [];
		for (let t = 0; t < soup.corners.length; t += 9) {
			const x = soup.corners[t] + soup.corners[t + 3] + soup.corners[t + 6];
			(x < 0 ? left : right).push(...soup.corners.subarray(t, t + 9));
		}
		const solids = [
			{ name: 'rear', triangleCount: left.length / 9 },
			{ name: 'front', triangleCount: right.length / 9 }
		];
		const two: Soup = { ...soup, corners: Float32Array.from([...left, ...right]), solids };
		const parent = await study.importShape(writeAsciiSoup(two), 'two.stl');
		await study.importMap(
			parent.id,
			csvOf(two, (_x, _y, z) => -1.5 - z)
		);
		const { id } = await study.addBox({
			centre: [0, 0, 0.4],
			halfSize: [1.5, 0.8, 0.45],
			held: { u0: 1, u1: 1, v0: 1, v1: 1, w0: 1, w1: 0 }
		});
		const lock = await study.draw<Lock>('locks', { name: 'Rear', patches: ['rear'], blend: 0.4 });
		const move = await study.move(parent.id, { boxIds: [id], step: 0.02, constraints: [] });
		expect(move.field).not.toBeNull();
		const before = await study.soup(parent.id);
		const after = await study.soup(move.shapeId);
		const bits = (s: Soup) => new Uint32Array(s.corners.buffer, s.corners.byteOffset, left.length);
		expect(bits(after)).toEqual(bits(before));
		expect(after.corners).not.toEqual(before.corners);
		expect((await study.shape(move.shapeId)).recipe?.locks).toMatchObject([
			{ id: lock.id, patches: ['rear'], blend: 0.4 }
		]);
		const part = await study.preview(parent.id, {
			boxIds: [id],
			step: 0.02,
			lockIds: [],
			constraints: [{ kind: 'volume', bound: 'hold', patches: ['front'] }]
		});
		expect(part.constraints).toMatchObject([
			{ kind: 'volume', patches: ['front'], kept: true, active: true, unit: 'm³' }
		]);
		const open = await study.preview(parent.id, { boxIds: [id], step: 0.02, constraints: [], lockIds: [] });
		expect(open.field).toBeNull();
		expect(open.weightedChange).toBeLessThan(move.weightedChange);
	});

	it('on a patch that the shape has not are refused by name', async () => {
		const { id } = await scene.draw<Lock>('locks', { name: 'Flange', patches: ['flange'] });
		const answer = await call(server, scene.token, 'POST', `/api/shapes/${shape.id}/moves/preview`, {
			...recipe,
			lockIds: [id]
		});
		expect(problemIn(answer, 422, 'invalid').errors?.[0]).toMatchObject({ pointer: '/lockIds/0' });
		await ok(server, scene.token, 'DELETE', `/api/locks/${id}`);
	});

	it('that lock nothing are refused', async () => {
		problemIn(await call(server, scene.token, 'POST', `/api/studies/${scene.study.id}/locks`, { name: 'None' }), 422);
	});
});

describe('symmetry', () => {
	it('of the study mirrors a move on one side, bit for bit', async () => {
		const study = await newScene(server, 'm');
		await ok(server, study.token, 'PATCH', `/api/studies/${study.study.id}`, {
			symmetry: { point: [0, 0, 0], normal: [0, 1, 0] }
		});
		const parent = await study.importShape(writeBinarySoup(soup), 'whole.stl');
		await study.importMap(
			parent.id,
			csvOf(soup, (x, y, z) => Math.cos(3 * x) + z + y)
		);
		const { id } = await study.addBox({
			centre: [0, 0.5, 0],
			halfSize: [1.5, 0.45, 0.8],
			held: { u0: 1, u1: 1, v0: 1, v1: 0, w0: 0, w1: 0 }
		});
		const move = await study.move(parent.id, { boxIds: [id], step: 0.02, smoothing: 0.05 });
		expect(move.lattices.map((l) => [l.boxId, l.mirrored])).toEqual([
			[id, false],
			[id, true]
		]);
		const unpaired = ({ corners }: Soup) => {
			const points = new Set<string>();
			for (let i = 0; i < corners.length; i += 3) points.add(`${corners[i]} ${corners[i + 1] + 0} ${corners[i + 2]}`);
			let count = 0;
			for (let i = 0; i < corners.length; i += 3) {
				if (!points.has(`${corners[i]} ${0 - corners[i + 1]} ${corners[i + 2]}`)) count++;
			}
			return count;
		};
		expect(unpaired(soup)).toBe(0);
		expect(unpaired(await study.soup(move.shapeId))).toBe(0);
		const off = await study.preview(parent.id, { boxIds: [id], step: 0.02, constraints: [], symmetry: false });
		expect(off.lattices).toHaveLength(1);
	});

	it('that the study has not cannot be asked for', async () => {
		const answer = await call(server, scene.token, 'POST', `/api/shapes/${shape.id}/moves/preview`, {
			...recipe,
			symmetry: true
		});
		expect(problemIn(answer, 422).errors?.[0].pointer).toBe('/symmetry');
	});
});

describe('control points moved by hand', () => {
	const pull = () => {
		const displacement = new Array<number>(3 * 5 * 4 * 4).fill(0);
		displacement[3 * ((2 * 4 + 2) * 4 + 3) + 2] = 0.04;
		return displacement;
	};

	it('are moved alone, with constraints reported and not enforced', async () => {
		const move = await scene.move(shape.id, {
			...recipe,
			constraints: [{ kind: 'volume', bound: 'hold' }],
			hand: [{ boxId: box.id, displacement: pull() }],
			handMode: 'replace'
		});
		expect(move.lattices[0].displacement).toEqual(pull());
		expect(move.constraints).toMatchObject([{ kind: 'volume', kept: false, active: false, price: null }]);
		expect(move.weightedChange).toBeLessThan(0);
		expect((await scene.shape(move.shapeId)).volume).toBeGreaterThan(shape.volume!);
	});

	it('are added to a computed move, which holds the volume of both together', async () => {
		const hand = [{ boxId: box.id, displacement: pull() }];
		const move = await scene.move(shape.id, { ...recipe, constraints: [{ kind: 'volume', bound: 'hold' }], hand });
		expect(move.constraints[0]).toMatchObject({ kept: true, active: true });
		expect(Math.abs((await scene.shape(move.shapeId)).volume! / shape.volume! - 1)).toBeLessThan(1e-9);
	});

	it('that are held are refused by name', async () => {
		const displacement = new Array<number>(240).fill(0);
		displacement[0] = 0.01;
		const hand = [{ boxId: box.id, displacement }];
		const answer = await call(server, scene.token, 'POST', `/api/shapes/${shape.id}/moves/preview`, {
			...recipe,
			hand
		});
		expect(problemIn(answer, 422).detail).toMatch(/Control point 0 of design box "Roof" is held/);
	});
});

describe('surface mode', () => {
	it('moves every vertex along its normal and is made again bit for bit', async () => {
		const asked: RecipeInput = {
			...recipe,
			mode: 'surface',
			smoothing: 0.1,
			constraints: [{ kind: 'volume', bound: 'hold' }]
		};
		const preview = await scene.preview(shape.id, asked);
		expect(preview.lattices).toEqual([]);
		expect(preview.field?.vertices.length).toBeGreaterThan(100);
		const [one, two] = [await scene.move(shape.id, asked), await scene.move(shape.id, asked)];
		expect(one.weightedChange).toBe(preview.weightedChange);
		expect(await scene.file(one.shapeId)).toEqual(await scene.file(two.shapeId));
	});

	it('says that bounds at places need a lattice', async () => {
		const answer = await call(server, scene.token, 'POST', `/api/shapes/${shape.id}/moves/preview`, {
			...recipe,
			mode: 'surface',
			constraints: [{ kind: 'displacement', outward: 0.01 }]
		});
		expect(problemIn(answer, 422, 'unsupported').mend).toMatch(/lattice/);
	});
});
