import { operations } from '$lib/api/contract';
import { handle } from '$lib/server/http/handle';
import { commitMove } from '$lib/server/services/moves';

export const POST = handle(operations.commitMove, async ({ params, body, access }) => ({
	jobId: await commitMove(params.id, body, access)
}));
