/** The whole main job as a person does it: on the demo by mouse, and from nothing with the forms filled in by keyboard alone. */
import { writeFileSync } from 'node:fs';
import type { Page } from '@playwright/test';
import { readSoup, soupOf, writeBinarySoup, type Soup } from '../factories/stl';
import { csvOf, ellipsoid } from '../factories/surfaces';
import { BenchPage } from './bench';
import {
	demoUser,
	download,
	expect,
	expectMoved,
	shapeNow,
	shapesNow,
	signIn,
	stlOf,
	studyNow,
	studyOf,
	tabTo,
	test
} from './support';

const MM = 1e-3;
test.describe.configure({ timeout: 480_000 });

/** Adds what the solver found, on the Ledger. */
async function addResult(page: Page, shape: RegExp, value: string, uncertainty: string): Promise<void> {
	await page.getByRole('button', { name: 'Add result' }).first().click();
	const dialog = page.getByRole('dialog', { name: 'Add a result' });
	const choice = dialog.getByLabel('Shape');
	const option = await choice.locator('option').filter({ hasText: shape }).getAttribute('value');
	await choice.selectOption(option);
	await dialog.getByRole('textbox', { name: 'Value' }).fill(value);
	await dialog.getByRole('textbox', { name: /^Uncertainty/ }).fill(uncertainty);
	await dialog.getByRole('button', { name: 'Add the result' }).click();
	await expect(dialog).toBeHidden();
}

async function uploadMap(page: Page, shape: RegExp, path: string): Promise<void> {
	await page.getByRole('button', { name: 'Upload map' }).first().click();
	const dialog = page.getByRole('dialog', { name: 'Upload a sensitivity map' });
	const choice = dialog.getByLabel('Shape');
	await choice.selectOption(await choice.locator('option').filter({ hasText: shape }).getAttribute('value'));
	await dialog.getByRole('radio', { name: /^raises/ }).check();
	await dialog.getByLabel('The map, a CSV file').setInputFiles(path);
	await dialog.getByRole('button', { name: 'Upload the map' }).click();
	await expect(dialog.getByText('The map covers the whole surface.')).toBeVisible({ timeout: 120_000 });
	await dialog.getByRole('button', { name: 'Done' }).click();
	await expect(dialog).toBeHidden();
}

test('the demo: a third and a fourth cycle by mouse', async ({ page }, info) => {
	await signIn(page, 'engineer');
	await page.getByRole('link', { name: 'Touring pod 430' }).click();
	await expect(page.getByRole('heading', { level: 1, name: /Touring pod 430/ })).toBeVisible();
	await expect(page.getByText(/invented/i).first()).toBeVisible();
	const before = await shapesNow(page);
	expect(before.map(({ number }) => number)).toEqual([0, 1, 2]);
	await expect(page.getByRole('region', { name: 'Shapes of the study' }).getByRole('row')).toHaveCount(4);

	await page.getByRole('link', { name: 'Bench', exact: true }).click();
	const bench = new BenchPage(page);
	const parent = await shapeNow(page, before[2].id);
	await bench.shows(parent.vertexCount);

	// A face by mouse: up in the picture is out of the box's upper face.
	const tail = (await studyNow(page)).boxes.find(({ name }) => name === 'Tail')!;
	await bench.boxes();
	await bench.choose('Tail');
	await bench.dragFace('Tail', 'w1', 0, -30);
	await bench.saved();
	const dragged = (await studyNow(page)).boxes.find(({ name }) => name === 'Tail')!;
	expect(dragged.version).toBe(tail.version + 1);
	expect(dragged.halfSize[2]).toBeGreaterThan(tail.halfSize[2]);
	// The opposite face stays where it was.
	expect(dragged.centre[2] - dragged.halfSize[2]).toBeCloseTo(tail.centre[2] - tail.halfSize[2], 6);

	await bench.type('Points along v', '6');
	await bench.saved();
	expect((await studyNow(page)).boxes.find(({ name }) => name === 'Tail')!.lattice).toEqual([7, 6, 5]);

	await bench.move();
	await bench.type('Step', '2.5 mm');
	await bench.type('Smoothing length', '30');
	await bench.preview();
	await expect(bench.sheet.getByText(/should fall by/)).toBeVisible();
	await expect(bench.picture).toHaveAttribute('data-shown', 'moved');
	await expect(bench.sheet.getByText(/First.order prediction/)).toBeVisible();

	const { dialog, shapeId } = await bench.commit(3, 'By mouse');
	const child = await shapeNow(page, shapeId);
	expect(child).toMatchObject({ number: 3, name: 'By mouse', parentId: parent.id, step: 0.0025, smoothing: 0.03 });
	const file = await download(page, dialog.getByRole('link', { name: 'Download STL' }));
	const largest = expectMoved(await stlOf(page, parent.id), file, child.recipe!.boxes, MM);
	expect(largest).toBeGreaterThan(0.0024);
	expect(largest).toBeLessThan(0.0026);

	await dialog.getByRole('link', { name: 'Ledger' }).click();
	await expect(page.getByRole('link', { name: '3 By mouse', exact: true })).toBeVisible();
	const found = parent.results[0].value + 0.8 * child.predicted[0].change!;
	await addResult(page, /^3 /, found.toFixed(2), '0.35');
	const row = page.getByRole('row').filter({ has: page.getByRole('link', { name: '3 By mouse', exact: true }) });
	await expect(row).toContainText('judged');
	await expect(row).toContainText(/0[.,](7[5-9]|8[0-5])/);

	// The next cycle: a map of the new shape, and a move from it.
	const map = info.outputPath('shape-3-drag.csv');
	writeFileSync(
		map,
		csvOf(file, (x, _, z) => (z > 100 ? 900 * Math.sin(x / 160) : 0))
	);
	await uploadMap(page, /^3 /, map);
	await row.getByRole('link', { name: '3 By mouse', exact: true }).click();
	await bench.shows(parent.vertexCount);
	await bench.preview();
	const fourth = await bench.commit(4, 'Again');
	const next = await download(page, fourth.dialog.getByRole('link', { name: 'Download STL' }));
	expectMoved(file, next, (await shapeNow(page, fourth.shapeId)).recipe!.boxes, MM);
	await fourth.dialog.getByRole('link', { name: 'Open shape 4' }).click();
	await expect(page).toHaveURL(/\/bench\/4$/);
	await bench.shows(parent.vertexCount);
});

test('from nothing: the forms by keyboard alone, the box drawn by mouse', async ({ page }, info) => {
	const mesh = ellipsoid(4, [1200, 450, 350]);
	const soup: Soup = soupOf(mesh.positions, mesh.triangles);
	const stl = info.outputPath('body.stl');
	writeFileSync(stl, writeBinarySoup(soup));
	const csv = info.outputPath('body-drag.csv');
	writeFileSync(
		csv,
		csvOf(readSoup(writeBinarySoup(soup)), (x, y, z) => 800 * Math.cos(x / 300) + y + z)
	);
	const { keyboard } = page;

	// Sign in.
	const user = demoUser('engineer');
	await page.goto('/');
	await tabTo(page, page.getByLabel('E-mail'));
	await keyboard.type(user.email);
	await keyboard.press('Tab');
	await keyboard.type(user.password);
	await keyboard.press('Enter');
	await expect(page.getByRole('heading', { level: 1, name: 'Studies' })).toBeVisible();

	// A study with one objective.
	await tabTo(page, page.getByRole('link', { name: 'New study' }));
	await keyboard.press('Enter');
	await expect(page.getByRole('heading', { level: 1, name: 'New study' })).toBeVisible();
	await tabTo(page, page.getByRole('textbox', { name: 'Name', exact: true }).first());
	await keyboard.type('Made by keyboard');
	const objective = page.getByRole('group', { name: 'Objective 1' });
	await tabTo(page, objective.getByLabel('Name'));
	await keyboard.type('Drag');
	await keyboard.press('Tab');
	await keyboard.type('N');
	await tabTo(page, page.getByRole('button', { name: 'Make the study' }));
	await keyboard.press('Enter');
	await expect(page.getByRole('heading', { name: 'No surface yet' })).toBeVisible();
	expect(await studyNow(page)).toMatchObject({ name: 'Made by keyboard', lengthUnit: 'mm' });

	// The baseline: Enter on the file's control opens the browser's own chooser.
	await tabTo(page, page.getByLabel(/The baseline’s surface/));
	const [surfaceChooser] = await Promise.all([page.waitForEvent('filechooser'), keyboard.press('Enter')]);
	await surfaceChooser.setFiles(stl);
	await expect(page.getByRole('region', { name: 'Shapes of the study' })).toBeVisible({ timeout: 120_000 });
	const [baseline] = await shapesNow(page);
	expect(baseline).toMatchObject({ number: 0, closed: true });

	// Its map.
	await tabTo(page, page.getByRole('button', { name: 'Upload map' }).first());
	await keyboard.press('Enter');
	const mapDialog = page.getByRole('dialog', { name: 'Upload a sensitivity map' });
	await tabTo(page, mapDialog.getByRole('radio', { name: /^raises/ }));
	await keyboard.press('Space');
	await tabTo(page, mapDialog.getByLabel('The map, a CSV file'));
	const [mapChooser] = await Promise.all([page.waitForEvent('filechooser'), keyboard.press('Enter')]);
	await mapChooser.setFiles(csv);
	await tabTo(page, mapDialog.getByRole('button', { name: 'Upload the map' }));
	await keyboard.press('Enter');
	await expect(mapDialog.getByText('The map covers the whole surface.')).toBeVisible({ timeout: 120_000 });
	await keyboard.press('Escape');
	await expect(mapDialog).toBeHidden();

	// The baseline's result.
	await tabTo(page, page.getByRole('button', { name: 'Add result' }).first());
	await keyboard.press('Enter');
	const resultDialog = page.getByRole('dialog', { name: 'Add a result' });
	await tabTo(page, resultDialog.getByRole('textbox', { name: 'Value' }));
	await keyboard.type('120.5');
	await tabTo(page, resultDialog.getByRole('button', { name: 'Add the result' }));
	await keyboard.press('Enter');
	await expect(resultDialog).toBeHidden();
	expect((await shapeNow(page, baseline.id)).results).toMatchObject([{ value: 120.5 }]);

	// The box: a click on the surface says where, the mouse draws it, the keyboard makes it exact.
	await page.goto(`/studies/${studyOf(page)}/bench`);
	const bench = new BenchPage(page);
	await bench.shows(mesh.positions.length / 3);
	await bench.boxes();
	const picture = (await bench.picture.boundingBox())!;
	await page.mouse.click(picture.x + picture.width * 0.4, picture.y + picture.height * 0.45);
	await bench.sheet.getByRole('button', { name: 'New box' }).click();
	await expect.poll(async () => (await studyNow(page)).boxes.length).toBe(1);
	const [drawn] = (await studyNow(page)).boxes;
	await bench.dragFace(drawn.name, 'u1', 40, 0);
	await bench.saved();
	expect((await studyNow(page)).boxes[0].halfSize[0]).not.toBeCloseTo(drawn.halfSize[0], 6);

	const enter = async (name: string, value: string) => {
		await tabTo(page, bench.sheet.getByRole('textbox', { name, exact: true }));
		await keyboard.press('Control+a');
		await keyboard.type(value);
		await keyboard.press('Enter');
	};
	await enter('Name', 'Front half');
	for (const [name, value] of [
		['Centre x', '700'],
		['Size along u', '1100 mm'],
		['Centre y', '0'],
		['Size along v', '1 m'],
		['Centre z', '0'],
		['Size along w', '800'],
		['Points along u', '6'],
		['Points along v', '4'],
		['Points along w', '4']
	]) {
		await enter(name, value);
	}
	const held = bench.sheet.getByRole('combobox', { name: /^Face u0/ });
	await tabTo(page, held);
	await keyboard.type('tangent');
	await bench.saved();
	expect((await studyNow(page)).boxes[0]).toMatchObject({
		name: 'Front half',
		centre: [0.7, 0, 0],
		halfSize: [0.55, 0.5, 0.4],
		lattice: [6, 4, 4],
		held: { u0: 2 }
	});

	// The move.
	await tabTo(page, bench.sheet.getByRole('button', { name: 'Next move' }));
	await keyboard.press('Enter');
	await enter('Step', '6');
	await enter('Smoothing length', '40 mm');
	await tabTo(page, bench.live);
	await keyboard.press('Space');
	await expect(bench.sheet.getByRole('button', { name: 'Cancel preview' })).toHaveCount(0);
	await tabTo(page, bench.sheet.getByRole('button', { name: 'Preview', exact: true }));
	await keyboard.press('Enter');
	await expect(bench.sheet.locator('[data-predicted]')).toBeVisible({ timeout: 120_000 });
	await tabTo(page, bench.sheet.getByRole('button', { name: 'Commit shape 1' }));
	await keyboard.press('Enter');
	const dialog = page.getByRole('dialog');
	await tabTo(page, dialog.getByRole('textbox', { name: /^Name/ }));
	await keyboard.type('First');
	await tabTo(page, dialog.getByRole('button', { name: 'Commit' }));
	await keyboard.press('Enter');
	await expect(dialog.locator('[data-made]')).toBeVisible({ timeout: 120_000 });
	const [file] = await Promise.all([
		page.waitForEvent('download'),
		tabTo(page, dialog.getByRole('link', { name: 'Download STL' })).then(() => keyboard.press('Enter'))
	]);
	expect(file.suggestedFilename()).toMatch(/\.stl$/);
	const [, first] = await shapesNow(page);
	const largest = expectMoved(soup, await stlOf(page, first.id), (await studyNow(page)).boxes, MM);
	expect(largest).toBeGreaterThan(0.0055);
	expect(largest).toBeLessThan(0.0065);
});
