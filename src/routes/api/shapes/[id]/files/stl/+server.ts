import { operations } from '$lib/api/contract';
import { fileResponse } from '$lib/server/http/files';
import { handle } from '$lib/server/http/handle';
import { stlFile } from '$lib/server/services/files';

export const GET = handle(operations.getStl, async ({ params, query, event }) =>
	fileResponse(event, await stlFile(params.id, query.encoding))
);
