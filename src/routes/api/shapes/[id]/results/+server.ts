import { operations } from '$lib/api/contract';
import { handle } from '$lib/server/http/handle';
import { createResult } from '$lib/server/services/shapes';

export const POST = handle(operations.createResult, ({ params, body, access }) =>
	createResult(params.id, body, access)
);
