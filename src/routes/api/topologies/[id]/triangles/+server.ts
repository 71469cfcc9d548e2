import { operations } from '$lib/api/contract';
import { fileResponse } from '$lib/server/http/files';
import { handle } from '$lib/server/http/handle';
import { trianglesFile } from '$lib/server/services/files';

export const GET = handle(operations.getTriangles, async ({ params, event }) =>
	fileResponse(event, await trianglesFile(params.id))
);
