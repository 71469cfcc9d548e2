import { operations } from '$lib/api/contract';
import { fileResponse } from '$lib/server/http/files';
import { handle } from '$lib/server/http/handle';
import { positionsFile } from '$lib/server/services/files';

export const GET = handle(operations.getPositions, async ({ params, event }) =>
	fileResponse(event, await positionsFile(params.id))
);
