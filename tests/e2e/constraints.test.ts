/** What a move must keep, as people set it on the Bench: a keep-out, a lock by patch and by paint, symmetry, a rehearsal, a move under them. */
import type { Page } from '@playwright/test';
import type { Job } from '../../src/lib/api/schemas/jobs';
import type { Study } from '../../src/lib/api/schemas/studies';
import { readSoup, soupOf, writeAsciiSoup, type Soup } from '../factories/stl';
import { ellipsoid } from '../factories/surfaces';
import { BenchPage } from './bench';
import {
	api,
	drag,
	expect,
	expectAccessible,
	expectNoSideways,
	shapeNow,
	shapesNow,
	signIn,
	stlOf,
	studyNow,
	test
} from './support';

const MM = 1e-3;
const HALF_LENGTH = 1200;
test.describe.configure({ timeout: 480_000 });

/** An ellipsoid of three patches: a belt behind the nose, the nose before it, the rest. Millimetres. */
function body(): { soup: Soup; vertices: number } {
	const { positions, triangles } = ellipsoid(4, [HALF_LENGTH, 450, 350]);
	const faces = Array.from({ length: triangles.length / 3 }, (_, t) => triangles.slice(3 * t, 3 * t + 3));
	const middle = (face: ArrayLike<number>) => [0, 1, 2].reduce((sum, c) => sum + positions[3 * face[c]] / 3, 0);
	const parts = {
		belt: faces.filter((face) => middle(face) >= -900 && middle(face) < -700),
		nose: faces.filter((face) => middle(face) < -900),
		rest: faces.filter((face) => middle(face) >= -700)
	};
	const ordered = Object.values(parts).flat();
	const soup = soupOf(
		positions,
		ordered.flatMap((face) => [...face])
	);
	soup.solids = Object.entries(parts).map(([name, { length }]) => ({ name, triangleCount: length }));
	return { soup, vertices: positions.length / 3 };
}

/** What the API changes, with the page's own session: a browser says where it comes from. */
async function send<T>(page: Page, path: string, data: unknown, type = 'application/json'): Promise<T> {
	const response = await page.request.post(path, {
		headers: { origin: new URL(page.url()).origin, 'content-type': type },
		data: data as string
	});
	expect(response.ok(), `${path}: ${await response.text()}`).toBe(true);
	return (await response.json()) as T;
}

/** A study with the body as its baseline and a box over its front half. */
async function newStudy(page: Page, soup: Soup): Promise<Study> {
	const study = await send<Study>(page, '/api/studies', { name: 'Under limits', lengthUnit: 'mm' });
	const { jobId } = await send<{ jobId: string }>(
		page,
		`/api/studies/${study.id}/shapes?filename=body.stl`,
		writeAsciiSoup(soup),
		'application/octet-stream'
	);
	await expect.poll(async () => (await api<Job>(page, `/api/jobs/${jobId}`)).state, { timeout: 120_000 }).toBe('done');
	await send(page, `/api/studies/${study.id}/boxes`, {
		name: 'Front',
		centre: [-0.7, 0, 0],
		halfSize: [0.6, 0.5, 0.4],
		lattice: [6, 5, 4],
		held: { u0: 0, u1: 2, v0: 0, v1: 0, w0: 0, w1: 0 }
	});
	return study;
}

/** The corners of a solid, float for float. */
function solidOf({ corners, solids }: Soup, name: string): Float32Array {
	let first = 0;
	for (const solid of solids) {
		if (solid.name === name) return corners.slice(9 * first, 9 * (first + solid.triangleCount));
		first += solid.triangleCount;
	}
	throw new Error(`no solid ${name}`);
}

test('a keep-out, a lock, symmetry and a rehearsal, and a move under them', async ({ page }) => {
	const { soup, vertices } = body();
	await signIn(page, 'engineer');
	const { id } = await newStudy(page, soup);

	// The Study page: the symmetry plane, and a rehearsal objective in place of a solver.
	await page.goto(`/studies/${id}/study`);
	await page.getByLabel('Plane', { exact: true }).selectOption('y');
	await page.getByRole('region', { name: 'Symmetry' }).getByRole('button', { name: 'Save' }).click();
	await expect.poll(async () => (await studyNow(page)).symmetry).toEqual({ point: [0, 0, 0], normal: [0, 1, 0] });
	await page.getByText('Add a rehearsal objective').click();
	const form = page.getByRole('group', { name: 'New rehearsal objective' });
	await form.getByLabel('Name').fill('Impact');
	await form.getByLabel('Computed').selectOption({ label: 'Impact-pressure drag area' });
	await expect(page.getByText(/rehearsal, not a flow solution/).first()).toBeVisible();
	await page.locator('form').filter({ has: form }).getByRole('button', { name: 'Add', exact: true }).click();
	await expect.poll(async () => (await studyNow(page)).objectives.map(({ name }) => name)).toEqual(['Impact']);

	// The Bench: rehearse the baseline, and a value and a map are there as if a solver had run.
	await page.goto(`/studies/${id}/bench`);
	const bench = new BenchPage(page);
	await bench.shows(vertices);
	await bench.live.uncheck();
	await bench.sheet.getByRole('button', { name: 'Rehearse baseline' }).click();
	const [baseline] = await shapesNow(page);
	await expect
		.poll(async () => (await shapeNow(page, baseline.id)).maps.map(({ rehearsal }) => rehearsal), { timeout: 60_000 })
		.toEqual([true]);
	await expect(bench.sheet.getByText(/rehearsal, not a flow solution/).first()).toBeVisible();

	// A plane a millimetre before the nose: by mouse, by key, and exactly by its numbers.
	await bench.sheet.getByRole('button', { name: /^Limits/ }).click();
	await bench.sheet.getByRole('button', { name: 'New plane' }).click();
	await expect.poll(async () => (await studyNow(page)).keepOuts.length).toBe(1);
	const plane = async () => (await studyNow(page)).keepOuts[0];
	const handle = page.locator('[data-handle="keep-out-plane"]');
	const drawn = await plane();
	await drag(page, handle, 0, -30);
	await expect.poll(async () => (await plane()).version).toBe(drawn.version + 1);
	expect((await plane()).geometry).not.toEqual(drawn.geometry);
	await handle.focus();
	await page.keyboard.press('ArrowUp');
	await expect.poll(async () => (await plane()).version).toBe(drawn.version + 2);
	await bench.type('Free side x', '1');
	await bench.type('Free side y', '0');
	await bench.type('Free side z', '0');
	await bench.type('Through x', String(-HALF_LENGTH - 1));
	await bench.type('Name', 'Bulkhead');
	await expect.poll(plane).toMatchObject({
		name: 'Bulkhead',
		geometry: { kind: 'halfSpace', point: [-1.201, expect.anything(), expect.anything()], normal: [1, 0, 0] }
	});

	// A lock by patch, put away and back, and one painted on the surface.
	await bench.sheet.getByRole('button', { name: 'Lock patches' }).click();
	await expect.poll(async () => (await studyNow(page)).locks.map(({ patches }) => patches)).toEqual([['belt']]);
	await bench.type('Blend distance', '60');
	await bench.type('Name', 'Belt');
	await expect.poll(async () => (await studyNow(page)).locks[0]).toMatchObject({ name: 'Belt', blend: 0.06 });
	await bench.sheet.getByRole('button', { name: 'Put away' }).click();
	await expect.poll(async () => (await studyNow(page)).locks).toEqual([]);
	await page.getByRole('button', { name: 'Undo', exact: true }).click();
	await expect.poll(async () => (await studyNow(page)).locks.length).toBe(1);

	await bench.sheet.getByRole('button', { name: 'Paint a lock' }).click();
	const painted = page.locator('[data-painted]');
	const count = async () => Number(await painted.getAttribute('data-painted'));
	await expect(painted).toHaveAttribute('data-painted', '0');
	await expectAccessible(page, 'painting a lock');
	const picture = (await bench.picture.boundingBox())!;
	const [x, y] = [picture.x + 0.38 * picture.width, picture.y + 0.5 * picture.height];
	await page.mouse.move(x, y);
	await expect(page.getByText(/^x\s+-?\d/).first()).toBeVisible();
	await page.mouse.down();
	for (let n = 1; n <= 8; n++) await page.mouse.move(x + 8 * n, y);
	await page.mouse.up();
	await expect.poll(async () => (await studyNow(page)).locks.length).toBe(2);
	const first = await count();
	expect(first).toBeGreaterThan(0);
	// A second stroke without a pointer, and back.
	await bench.sheet.getByRole('radio', { name: 'Fill' }).check();
	await bench.type('Up to edges of', '180');
	await bench.sheet.getByRole('button', { name: 'Fill the middle of the picture' }).click();
	await expect.poll(count).toBe(soup.corners.length / 9);
	await bench.sheet.getByRole('button', { name: 'Undo the stroke' }).click();
	await expect.poll(count).toBe(first);
	await bench.sheet.getByRole('button', { name: 'Done' }).click();
	const stored = (await studyNow(page)).locks[1];
	expect(stored.painted!.ranges.filter((_, i) => i % 2).reduce((sum, n) => sum + n, 0)).toBe(first);
	// Only the belt is kept by this move.
	await bench.sheet.getByRole('checkbox', { name: `${stored.name} kept by the move` }).uncheck();
	await expectAccessible(page, 'the limits');
	await page.setViewportSize({ width: 390, height: 844 });
	await expectNoSideways(page, 'the limits at 390 px');
	await expectAccessible(page, 'the limits, 390 px');
	await page.setViewportSize({ width: 1440, height: 900 });

	// The move is as long as the plane and the belt let it be.
	await bench.move();
	await bench.type('Step', '6 mm');
	await bench.type('Smoothing length', '30');
	await bench.preview();
	const row = bench.sheet.getByRole('row').filter({ hasText: 'Clear of Bulkhead' });
	await expect(row).toContainText(/m²\/mm/);
	await row.getByRole('button', { name: /^Show me/ }).click();
	const { shapeId } = await bench.commit(1, 'Under limits');
	const child = await shapeNow(page, shapeId);
	expect(child.constraints).toContainEqual(
		expect.objectContaining({ kind: 'keepOut', name: 'Bulkhead', kept: true, active: true })
	);
	expect(child.constraints.find(({ kind }) => kind === 'keepOut')!.price).toBeGreaterThan(0);
	expect(child.predicted[0].change).toBeLessThan(0);
	expect(child.recipe).toMatchObject({ locks: [{ name: 'Belt' }], symmetry: { normal: [0, 1, 0] } });
	const file = await stlOf(page, shapeId);
	const parent = await stlOf(page, baseline.id);
	// The file is in millimetres as float32: half its last place there is the store's rounding.
	const front = file.corners.reduce((least, c, i) => (i % 3 === 0 ? Math.min(least, c) : least), 0);
	expect(front).toBeLessThan(-HALF_LENGTH - 0.5);
	expect(front).toBeGreaterThan(-HALF_LENGTH - 1 - 1e-3);
	const text = async (of: string) => {
		const response = await page.request.get(`/api/shapes/${of}/files/stl?encoding=ascii`);
		return response.body();
	};
	const [before, after] = [readSoup(await text(baseline.id)), readSoup(await text(shapeId))];
	expect(after.solids).toEqual(before.solids);
	expect(solidOf(after, 'belt')).toEqual(solidOf(before, 'belt'));
	expect(solidOf(after, 'nose')).not.toEqual(solidOf(before, 'nose'));
	expect(Math.abs(child.volume! - baseline.volume!) / baseline.volume!).toBeLessThan(1e-9);
	expect(child.maxDisplacement! * (1 / MM)).toBeLessThanOrEqual(6.001);
	expect(file.corners.length).toBe(parent.corners.length);
});

test('a reviewer draws keep-outs and nothing else', async ({ page }) => {
	await signIn(page, 'reviewer');
	const studies = await api<{ id: string; name: string }[]>(page, '/api/studies');
	const demo = studies.find(({ name }) => name === 'Touring pod 430')!;
	await page.goto(`/studies/${demo.id}/bench/0`);
	const bench = new BenchPage(page);
	await expect(bench.picture).toHaveAttribute('data-vertices', /\d/);
	await bench.sheet.getByRole('button', { name: /^Limits/ }).click();
	await expect(bench.sheet.getByRole('button', { name: 'Paint a lock' })).toHaveCount(0);
	const before = (await studyNow(page)).keepOuts.length;
	await bench.sheet.getByRole('button', { name: 'New box' }).click();
	await expect.poll(async () => (await studyNow(page)).keepOuts.length).toBe(before + 1);
	const drawn = (await studyNow(page)).keepOuts.at(-1)!;
	await drag(page, page.locator('[data-handle="keep-out-w1"]'), 0, -25);
	await expect
		.poll(async () => (await studyNow(page)).keepOuts.find((k) => k.id === drawn.id)!.version)
		.toBe(drawn.version + 1);
	await bench.sheet.getByRole('button', { name: 'Put away' }).click();
	await expect.poll(async () => (await studyNow(page)).keepOuts.length).toBe(before);
});
