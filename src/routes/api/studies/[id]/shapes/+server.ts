import { operations } from '$lib/api/contract';
import { withUpload } from '$lib/server/content/upload';
import { uploadOf } from '$lib/server/http/files';
import { handle } from '$lib/server/http/handle';
import { importShape, listShapes } from '$lib/server/services/shapes';

export const GET = handle(operations.listShapes, ({ params }) => listShapes(params.id));

export const POST = handle(operations.importShape, async ({ params, query, access, event }) => {
	const { body, announced } = uploadOf(event);
	const { filename } = query;
	return withUpload(body, { filename, announced }, async (upload) => ({
		jobId: await importShape(params.id, query, upload, access)
	}));
});
