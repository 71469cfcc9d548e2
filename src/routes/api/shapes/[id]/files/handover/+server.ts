import { operations } from '$lib/api/contract';
import { fileResponse } from '$lib/server/http/files';
import { handle } from '$lib/server/http/handle';
import { handoverFile } from '$lib/server/services/files';

export const GET = handle(operations.getHandover, async ({ params, event }) =>
	fileResponse(event, await handoverFile(params.id))
);
