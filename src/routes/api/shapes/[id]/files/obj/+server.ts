import { operations } from '$lib/api/contract';
import { fileResponse } from '$lib/server/http/files';
import { handle } from '$lib/server/http/handle';
import { meshFile } from '$lib/server/services/files';

export const GET = handle(operations.getObj, async ({ params, event }) =>
	fileResponse(event, await meshFile(params.id, 'obj'))
);
