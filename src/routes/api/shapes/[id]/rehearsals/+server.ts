import { operations } from '$lib/api/contract';
import { handle } from '$lib/server/http/handle';
import { rehearse } from '$lib/server/services/rehearsals';

export const POST = handle(operations.rehearse, async ({ access, params, body }) => ({
	jobId: await rehearse(params.id, body, access)
}));
