import { sveltekit } from '@sveltejs/kit/vite';
import { defineConfig } from 'vitest/config';

const project = (name: string, more: object = {}) => ({
	extends: true as const,
	test: { name, include: [`tests/${name}/**/*.test.ts`], environment: 'node', ...more }
});

export default defineConfig({
	plugins: [sveltekit()],
	test: {
		// A test that checks nothing cannot fail.
		expect: { requireAssertions: true },
		// Two slow cores, which PostgreSQL and the servers under test share.
		maxWorkers: 2,
		testTimeout: 60_000,
		projects: [
			project('unit'),
			project('property'),
			project('reference', { testTimeout: 180_000, hookTimeout: 300_000 }),
			project('fuzz', { testTimeout: 180_000 }),
			project('integration', {
				globalSetup: 'tests/harness/global-setup.ts',
				pool: 'forks',
				testTimeout: 120_000,
				hookTimeout: 180_000,
				teardownTimeout: 60_000
			})
		]
	}
});
