import { operations } from '$lib/api/contract';
import { fileResponse } from '$lib/server/http/files';
import { handle } from '$lib/server/http/handle';
import { keepOutMeshFile } from '$lib/server/services/files';

export const GET = handle(operations.getKeepOutMesh, async ({ params, event }) =>
	fileResponse(event, await keepOutMeshFile(params.id))
);
