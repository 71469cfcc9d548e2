import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import { test as base, type Page } from '@playwright/test';

export interface DemoUser {
	role: 'engineer' | 'reviewer' | 'viewer' | 'admin';
	email: string;
	password: string;
}

/** The demo's person with that role, of the installation that the end-to-end tests run against. */
export function demoUser(role: DemoUser['role']): DemoUser {
	const path = join(process.env.PLANISH_E2E_DATA ?? '', 'demo.json');
	const { users } = JSON.parse(readFileSync(path, 'utf8')) as { users: DemoUser[] };
	const user = users.find((candidate) => candidate.role === role);
	if (!user) throw new Error(`${path} has no user with the role ${role}`);
	return user;
}

/** Signs in through the form, as a person would. */
export async function signIn(page: Page, role: DemoUser['role']): Promise<void> {
	const user = demoUser(role);
	await page.goto('/');
	await page.getByLabel(/e-?mail/i).fill(user.email);
	await page.getByLabel(/password/i).fill(user.password);
	await page.getByRole('button', { name: /sign in/i }).click();
	await page.waitForURL((url) => !/sign-?in/.test(url.pathname));
}

/** Playwright's test, with the page's uncaught errors failing the test that caused them. */
export const test = base.extend<{ noPageErrors: void }>({
	noPageErrors: [
		async ({ page }, use) => {
			const errors: Error[] = [];
			page.on('pageerror', (error) => errors.push(error));
			await use();
			if (errors.length > 0) throw new AggregateError(errors, `The page threw: ${errors.map(String).join('; ')}`);
		},
		{ auto: true }
	]
});

export { expect } from '@playwright/test';
