/** The Bench as a person works on it. */
import type { Locator, Page } from '@playwright/test';
import { drag, expect } from './support';

const MAKING = 120_000;

export class BenchPage {
	readonly picture: Locator;
	readonly sheet: Locator;

	constructor(readonly page: Page) {
		this.picture = page.getByRole('application', { name: /surface in 3D/ });
		this.sheet = page.getByRole('complementary', { name: 'Move and boxes' });
	}

	async shows(vertices: number): Promise<void> {
		await expect(this.picture).toHaveAttribute('data-vertices', String(vertices));
	}

	/** Chooses a box by its name in the picture. */
	async choose(name: string): Promise<void> {
		const label = this.page.getByRole('button', { name: `Design box ${name}` });
		if ((await label.getAttribute('aria-pressed')) !== 'true') await label.click();
		await expect(label).toHaveAttribute('aria-pressed', 'true');
	}

	async dragFace(box: string, face: string, dx: number, dy: number): Promise<void> {
		await drag(this.page, this.page.getByRole('button', { name: new RegExp(`^${box}: face ${face}`) }), dx, dy);
	}

	async boxes(): Promise<void> {
		await this.sheet.getByRole('button', { name: /^Boxes \d/ }).click();
	}

	async move(): Promise<void> {
		await this.sheet.getByRole('button', { name: 'Next move' }).click();
	}

	/** Types a value and leaves the field. */
	async type(name: string, value: string): Promise<void> {
		const field = this.sheet.getByRole('textbox', { name, exact: true });
		await field.fill(value);
		await field.press('Enter');
	}

	async saved(): Promise<void> {
		await expect(this.sheet.locator('[data-save-state]')).toHaveAttribute('data-save-state', 'saved');
	}

	/** Previews only when asked, so that a test knows which preview it sees. */
	get live(): Locator {
		return this.sheet.getByRole('checkbox', { name: 'Preview as I change things' });
	}

	async preview(): Promise<void> {
		await this.live.uncheck();
		await expect(this.sheet.getByRole('button', { name: 'Cancel preview' })).toHaveCount(0, { timeout: MAKING });
		await this.sheet.getByRole('button', { name: 'Preview', exact: true }).click();
		await expect(this.sheet.locator('[data-predicted]')).toBeVisible({ timeout: MAKING });
	}

	/** Commits and leaves the dialog open that hands over the new shape; its id is returned. */
	async commit(number: number, name: string): Promise<{ dialog: Locator; shapeId: string }> {
		await this.sheet.getByRole('button', { name: `Commit shape ${number}` }).click();
		const dialog = this.page.getByRole('dialog');
		await dialog.getByRole('textbox', { name: /^Name/ }).fill(name);
		await dialog.getByRole('button', { name: 'Commit' }).click();
		const made = dialog.locator('[data-made]');
		await expect(made).toBeVisible({ timeout: MAKING });
		return { dialog, shapeId: (await made.getAttribute('data-made'))! };
	}
}
