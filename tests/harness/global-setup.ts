import type { TestProject } from 'vitest/node';
import { ensureBuilt } from '../../scripts/lib/build.mjs';
import { startTestPostgres } from './postgres';

declare module 'vitest' {
	export interface ProvidedContext {
		/** A superuser's connection to the tests' PostgreSQL. */
		postgresUrl: string;
	}
}

/** Runs once before the integration tests: the build if sources changed, a PostgreSQL of their own, a migrated template. */
export default async function setup(project: TestProject) {
	await ensureBuilt();
	const postgres = await startTestPostgres();
	project.provide('postgresUrl', postgres.url);
	return () => postgres.stop();
}
