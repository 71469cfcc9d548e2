import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { defineConfig } from '@playwright/test';
import { freePort } from './scripts/lib/ports.mjs';

// Playwright's workers read this file again and inherit the environment: the first reading decides.
process.env.PLANISH_E2E_PORT ??= String(await freePort());
if (!process.env.PLANISH_E2E_DATA) {
	const data = mkdtempSync(join(tmpdir(), 'planish-e2e-'));
	process.env.PLANISH_E2E_DATA = data;
	process.on('exit', () => rmSync(data, { recursive: true, force: true }));
}
const baseURL = `http://127.0.0.1:${process.env.PLANISH_E2E_PORT}`;

export default defineConfig({
	testDir: 'tests/e2e',
	outputDir: 'test-results/e2e',
	// The tests share one server, one database and two cores; WebGL is drawn in software.
	workers: 1,
	fullyParallel: false,
	retries: 0,
	forbidOnly: Boolean(process.env.CI),
	timeout: 180_000,
	expect: { timeout: 30_000 },
	reporter: [['list'], ['json', { outputFile: 'test-results/e2e.json' }]],
	use: {
		baseURL,
		// A control that stays disabled fails its test soon, not at the test's end.
		actionTimeout: 60_000,
		viewport: { width: 1440, height: 900 },
		acceptDownloads: true,
		screenshot: 'only-on-failure',
		trace: 'retain-on-failure',
		launchOptions: {
			// Debian's: Playwright's own browsers are never downloaded.
			executablePath: process.env.PLANISH_CHROMIUM || '/usr/bin/chromium',
			args: [
				'--no-sandbox',
				'--disable-quic',
				'--no-first-run',
				'--disable-background-networking',
				'--disable-component-update',
				'--disable-sync',
				'--use-gl=angle',
				'--use-angle=swiftshader',
				'--enable-unsafe-swiftshader'
			]
		}
	},
	// The product itself, started as a person starts it, with a data folder of its own.
	webServer: {
		command: 'node scripts/start.mjs',
		url: `${baseURL}/api/health`,
		timeout: 300_000,
		reuseExistingServer: false,
		gracefulShutdown: { signal: 'SIGTERM', timeout: 60_000 },
		stdout: 'pipe',
		stderr: 'pipe',
		env: {
			...(process.env as Record<string, string>),
			HOST: '127.0.0.1',
			PORT: process.env.PLANISH_E2E_PORT,
			PLANISH_DATA: process.env.PLANISH_E2E_DATA,
			ORIGIN: baseURL,
			// Tests never touch a database that they did not make.
			DATABASE_URL: ''
		}
	}
});
