import { operations } from '$lib/api/contract';
import { fileResponse } from '$lib/server/http/files';
import { handle } from '$lib/server/http/handle';
import { originalFile } from '$lib/server/services/files';

export const GET = handle(operations.getOriginal, async ({ params, event }) =>
	fileResponse(event, await originalFile(params.id))
);
