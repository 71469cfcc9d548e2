/** Who may do what, on the screens: signing in and out, roles, people, tokens. */
import { demoUser, expect, signIn, test } from './support';

test('a wrong password is refused and what was typed stays', async ({ page }) => {
	await page.goto('/studies');
	await expect(page.getByRole('heading', { level: 1, name: 'Sign in' })).toBeVisible();
	const { email } = demoUser('engineer');
	await page.getByLabel('E-mail').fill(email);
	await page.getByLabel('Password').fill('not the password at all');
	await page.getByRole('button', { name: 'Sign in' }).click();
	await expect(page.getByRole('alert')).toBeVisible();
	await expect(page.getByLabel('E-mail')).toHaveValue(email);
});

test('a viewer reads everything and is offered nothing that changes it', async ({ page }) => {
	await signIn(page, 'viewer');
	await page.getByRole('link', { name: 'Touring pod 430' }).click();
	await expect(page.getByRole('region', { name: 'Shapes of the study' })).toBeVisible();
	await expect(page.getByRole('button', { name: 'Add result' })).toHaveCount(0);
	await expect(page.getByRole('button', { name: 'Upload map' })).toHaveCount(0);
	await page.getByRole('link', { name: 'Study', exact: true }).click();
	await expect(page.getByRole('heading', { name: 'Objectives' })).toBeVisible();
	await expect(page.getByRole('button', { name: 'Save' })).toHaveCount(0);
	await page.getByRole('link', { name: 'Bench', exact: true }).click();
	await expect(page.getByRole('application', { name: /surface in 3D/ })).toHaveAttribute('data-vertices', /\d/);
	const sheet = page.getByRole('complementary', { name: 'Move and boxes' });
	await expect(sheet.getByRole('button', { name: /^Commit shape/ })).toBeDisabled();
	await sheet.getByRole('button', { name: /^Boxes \d/ }).click();
	await expect(sheet.getByRole('button', { name: 'New box' })).toHaveCount(0);
});

test('signing out ends the session', async ({ page }) => {
	const { email } = demoUser('engineer');
	await signIn(page, 'engineer');
	await page.goto('/account');
	await expect(page.getByText(email)).toBeVisible();
	await page.getByRole('main').getByRole('button', { name: 'Sign out' }).click();
	await page.waitForURL(/sign-in/);
	await page.goto('/studies');
	await expect(page).toHaveURL(/sign-in/);
});

test('an administrator adds a person, who signs in and makes a token', async ({ page }) => {
	await signIn(page, 'admin');
	await page.goto('/admin');
	const email = `walker-${Date.now()}@planish.test`;
	await page.getByRole('textbox', { name: 'Name' }).fill('Wanda Walker');
	await page.getByRole('textbox', { name: 'E-mail' }).fill(email);
	await page.getByLabel('First password').fill('a password of some length');
	await page.getByRole('button', { name: 'Add the person' }).click();
	await expect(page.getByRole('cell', { name: email })).toBeVisible();

	await page.context().clearCookies();
	await page.goto('/');
	await page.getByLabel('E-mail').fill(email);
	await page.getByLabel('Password').fill('a password of some length');
	await page.getByRole('button', { name: 'Sign in' }).click();
	await expect(page.getByRole('heading', { name: 'No study yet' })).toBeVisible();
	expect((await page.request.get('/admin')).status()).toBe(403);

	await page.goto('/account');
	await page.getByRole('textbox', { name: /^New token/ }).fill('Pipeline');
	await page.getByRole('button', { name: 'Make the token' }).click();
	const shown = page.getByRole('status').locator('code');
	await expect(shown).toBeVisible();
	const token = (await shown.textContent())!.trim();
	const asProgram = await page.request.fetch('/api/studies', { headers: { authorization: `Bearer ${token}` } });
	expect(asProgram.status()).toBe(200);
	await page.getByRole('button', { name: 'Revoke Pipeline' }).click();
	await page.getByRole('alertdialog').getByRole('button', { name: 'Revoke it' }).click();
	await expect(page.getByRole('row').filter({ hasText: 'Pipeline' })).toContainText('revoked');
});
