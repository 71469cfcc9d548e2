/**
 * Every operation of the API in one table: its path, who may call it, what it takes and what it answers. Route handlers are
 * made from these rows (server/http/handle.ts), `/api/openapi.json` is generated from them, and a test walks them with every
 * role. A route without a row, or a row without a route, fails that test.
 */
import { drawnOperations } from './contract/drawn';
import { jobsOperations } from './contract/jobs';
import { peopleOperations } from './contract/people';
import { shapesOperations } from './contract/shapes';
import { studiesOperations } from './contract/studies';
import type { Operation } from './contract/operation';

export const operations = {
	...jobsOperations,
	...peopleOperations,
	...studiesOperations,
	...drawnOperations,
	...shapesOperations
} satisfies Record<string, Operation>;

export type OperationName = keyof typeof operations;
