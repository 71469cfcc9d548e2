import { operations } from '$lib/api/contract';
import { fileResponse } from '$lib/server/http/files';
import { handle } from '$lib/server/http/handle';
import { densityFile } from '$lib/server/services/files';

export const GET = handle(operations.getMapValues, async ({ params, event }) =>
	fileResponse(event, await densityFile(params.id))
);
