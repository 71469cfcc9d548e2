/** Every screen, light and dark, wide and narrow: axe finds nothing grave, nothing scrolls sideways, the console is quiet. */
import type { Page } from '@playwright/test';
import { BenchPage } from './bench';
import { expect, expectAccessible, expectNoSideways, signIn, test } from './support';

const WIDE = { width: 1440, height: 900 };
const NARROW = { width: 390, height: 844 };

async function demoStudy(page: Page): Promise<string> {
	const response = await page.request.get('/api/studies');
	const studies = (await response.json()) as { id: string; name: string }[];
	return studies.find(({ name }) => name === 'Touring pod 430')!.id;
}

/** Screens of the demo, with what says that each is there. */
const screens: { name: string; path: (study: string) => string; ready: (page: Page) => Promise<void> }[] = [
	{
		name: 'Studies',
		path: () => '/studies',
		ready: (page) => expect(page.getByRole('link', { name: 'Touring pod 430' })).toBeVisible()
	},
	{
		name: 'New study',
		path: () => '/studies/new',
		ready: (page) => expect(page.getByRole('button', { name: 'Make the study' })).toBeVisible()
	},
	{
		name: 'Ledger',
		path: (study) => `/studies/${study}`,
		ready: (page) => expect(page.getByRole('region', { name: 'Shapes of the study' })).toBeVisible()
	},
	{
		name: 'Bench',
		path: (study) => `/studies/${study}/bench`,
		ready: (page) =>
			expect(page.getByRole('application', { name: /surface in 3D/ })).toHaveAttribute('data-vertices', /\d/)
	},
	{
		name: 'Study',
		path: (study) => `/studies/${study}/study`,
		ready: (page) => expect(page.getByRole('heading', { name: 'Objectives' })).toBeVisible()
	},
	{
		name: 'Account',
		path: () => '/account',
		ready: (page) => expect(page.getByRole('heading', { level: 1, name: 'Your account' })).toBeVisible()
	}
];

for (const colorScheme of ['light', 'dark'] as const) {
	test.describe(colorScheme, () => {
		test.use({ colorScheme });

		test('the engineer’s screens, wide and narrow', async ({ page }) => {
			test.setTimeout(480_000);
			await expectSignIn(page, colorScheme);
			await signIn(page, 'engineer');
			const study = await demoStudy(page);
			for (const { name, path, ready } of screens) {
				await page.setViewportSize(WIDE);
				await page.goto(path(study));
				await ready(page);
				await expectAccessible(page, `${name}, ${colorScheme}`);
				await expectNoSideways(page, `${name} at 1440 px`);
				await page.setViewportSize(NARROW);
				await ready(page);
				await expectNoSideways(page, `${name} at 390 px`);
				await expectAccessible(page, `${name}, ${colorScheme}, 390 px`);
			}
		});

		test('the Ledger’s and the Bench’s dialogs', async ({ page }) => {
			test.setTimeout(480_000);
			await signIn(page, 'engineer');
			const study = await demoStudy(page);
			await page.goto(`/studies/${study}`);
			for (const [button, title] of [
				['Add result', 'Add a result'],
				['Upload map', 'Upload a sensitivity map']
			]) {
				await page.getByRole('button', { name: button }).first().click();
				await expect(page.getByRole('dialog', { name: title })).toBeVisible();
				await expectAccessible(page, `${title}, ${colorScheme}`);
				await page.keyboard.press('Escape');
			}
			// The newest shape may wait for its map, and then has no move to commit; the demo's second has one.
			await page.goto(`/studies/${study}/bench/2`);
			const sheet = page.getByRole('complementary', { name: 'Move and boxes' });
			await expect(page.getByRole('button', { name: 'Design box Tail' })).toBeVisible();
			await sheet.getByRole('button', { name: /^Boxes \d/ }).click();
			await new BenchPage(page).choose('Tail');
			await expect(sheet.getByRole('textbox', { name: 'Points along u' })).toBeVisible();
			await expectAccessible(page, `Boxes, ${colorScheme}`);
			await page.keyboard.press('Escape');
			await page.keyboard.press('?');
			await expect(page.getByRole('dialog', { name: 'Keys of the Bench' })).toBeVisible();
			await expectAccessible(page, `Keys, ${colorScheme}`);
			await page.keyboard.press('Escape');
			await sheet.getByRole('button', { name: 'Next move' }).click();
			await sheet.getByRole('button', { name: /^Commit shape/ }).click();
			await expect(page.getByRole('dialog', { name: /^Commit shape/ })).toBeVisible();
			await expectAccessible(page, `Commit, ${colorScheme}`);
		});

		test('the administrator’s screen', async ({ page }) => {
			await signIn(page, 'admin');
			await page.goto('/admin');
			await expect(page.getByRole('heading', { level: 1, name: 'Administration' })).toBeVisible();
			await expectAccessible(page, `Administration, ${colorScheme}`);
			await page.setViewportSize(NARROW);
			await expectNoSideways(page, 'Administration at 390 px');
		});
	});
}

async function expectSignIn(page: Page, colorScheme: string): Promise<void> {
	await page.goto('/');
	await expect(page.getByRole('heading', { level: 1, name: 'Sign in' })).toBeVisible();
	await expectAccessible(page, `Sign in, ${colorScheme}`);
	await page.setViewportSize(NARROW);
	await expectNoSideways(page, 'Sign in at 390 px');
	await page.setViewportSize(WIDE);
}
