/** What the end-to-end tests share: a page that must stay quiet, axe, and the files that go in and come out. */
import { readFileSync } from 'node:fs';
import AxeBuilder from '@axe-core/playwright';
import type { Download, Locator, Page } from '@playwright/test';
import type { Box } from '../../src/lib/api/schemas/drawn';
import type { Shape, ShapeSummary } from '../../src/lib/api/schemas/shapes';
import type { Study } from '../../src/lib/api/schemas/studies';
import { readSoup, soupVolume, type Soup } from '../factories/stl';
import { test as base, expect } from '../harness/e2e';

export { demoUser, expect, signIn } from '../harness/e2e';

/** Fails a test whose page writes an error to its console. */
export const test = base.extend<{ quietConsole: void }>({
	quietConsole: [
		async ({ page }, use) => {
			const errors: string[] = [];
			page.on('console', (message) => {
				if (message.type() === 'error') errors.push(`${message.text()} (${message.location().url})`);
			});
			await use();
			expect(errors, 'errors in the page’s console').toEqual([]);
		},
		{ auto: true }
	]
});

/** No violation of the two grave kinds; the others are counted by the people who look after the screens. */
export async function expectAccessible(page: Page, what: string): Promise<void> {
	const { violations } = await new AxeBuilder({ page }).analyze();
	const grave = violations
		.filter(({ impact }) => impact === 'serious' || impact === 'critical')
		.map(({ id, nodes }) => `${id}: ${nodes.map(({ target }) => target.join(' ')).join(' | ')}`);
	expect(grave, `axe on ${what}`).toEqual([]);
}

/** The page is no wider than its window. */
export async function expectNoSideways(page: Page, what: string): Promise<void> {
	const { scroll, client } = await page.evaluate(() => ({
		scroll: document.documentElement.scrollWidth,
		client: document.documentElement.clientWidth
	}));
	expect(scroll, `${what} is wider than its window`).toBeLessThanOrEqual(client);
}

/** A JSON answer of the API with the page's own session. */
export async function api<T>(page: Page, path: string): Promise<T> {
	const response = await page.request.get(path);
	expect(response.status(), path).toBe(200);
	return (await response.json()) as T;
}

export const studyOf = (page: Page) => new URL(page.url()).pathname.split('/')[2];
export const studyNow = (page: Page) => api<Study>(page, `/api/studies/${studyOf(page)}`);
export const shapesNow = (page: Page) => api<ShapeSummary[]>(page, `/api/studies/${studyOf(page)}/shapes`);
export const shapeNow = (page: Page, id: string) => api<Shape>(page, `/api/shapes/${id}`);

export async function stlOf(page: Page, shapeId: string): Promise<Soup> {
	const response = await page.request.get(`/api/shapes/${shapeId}/files/stl?encoding=binary`);
	expect(response.status()).toBe(200);
	return readSoup(await response.body());
}

export async function downloaded(download: Download): Promise<Soup> {
	return readSoup(readFileSync(await download.path()));
}

/** Clicks what starts a download and waits for the file. */
export async function download(page: Page, trigger: Locator): Promise<Soup> {
	const [file] = await Promise.all([page.waitForEvent('download'), trigger.click()]);
	return downloaded(file);
}

/** Whether a point (metres) lies in a box that stands along the frame's axes. */
const inside = ({ centre, halfSize }: Box, p: number[]) => p.every((x, c) => Math.abs(x - centre[c]) <= halfSize[c]);

/**
 * The child has its parent's triangles; no corner outside the boxes changed a bit; the volume is held to 1e-9.
 * @returns the largest displacement, in metres
 */
export function expectMoved(parent: Soup, child: Soup, boxes: Box[], metresPerUnit: number): number {
	for (const { rotation } of boxes) expect(rotation).toEqual([0, 0, 0, 1]);
	expect(child.corners.length).toBe(parent.corners.length);
	let outside = 0;
	let changedOutside = 0;
	let largest = 0;
	for (let at = 0; at < parent.corners.length; at += 3) {
		const before = parent.corners.subarray(at, at + 3);
		const after = child.corners.subarray(at, at + 3);
		const far = Math.hypot(after[0] - before[0], after[1] - before[1], after[2] - before[2]) * metresPerUnit;
		largest = Math.max(largest, far);
		const metres = [...before].map((x) => x * metresPerUnit);
		if (boxes.some((box) => inside(box, metres))) continue;
		outside++;
		if (![0, 1, 2].every((c) => Object.is(before[c], after[c]))) changedOutside++;
	}
	expect(outside).toBeGreaterThan(0);
	expect(changedOutside).toBe(0);
	expect(Math.abs(soupVolume(child) / soupVolume(parent) - 1)).toBeLessThan(1e-9);
	return largest;
}

/** Drags with the mouse in several moves, as a hand does. */
export async function drag(page: Page, handle: Locator, dx: number, dy: number): Promise<void> {
	const box = (await handle.boundingBox())!;
	const [x, y] = [box.x + box.width / 2, box.y + box.height / 2];
	await page.mouse.move(x, y);
	await page.mouse.down();
	for (let n = 1; n <= 5; n++) await page.mouse.move(x + (dx * n) / 5, y + (dy * n) / 5);
	await page.mouse.up();
}

/** Tabs until the control has the focus: the way without a mouse. */
export async function tabTo(page: Page, control: Locator, limit = 80): Promise<void> {
	for (let n = 0; n < limit; n++) {
		if (await control.evaluate((element) => element === document.activeElement)) return;
		await page.keyboard.press('Tab');
	}
	throw new Error(`Tab does not reach ${String(control)} in ${limit} steps`);
}
