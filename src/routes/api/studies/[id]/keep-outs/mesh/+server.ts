import { operations } from '$lib/api/contract';
import { withUpload } from '$lib/server/content/upload';
import { uploadOf } from '$lib/server/http/files';
import { handle } from '$lib/server/http/handle';
import { importKeepOut } from '$lib/server/services/keep-outs';

export const POST = handle(operations.importKeepOut, async ({ params, query, access, event }) => {
	const { body, announced } = uploadOf(event);
	const { filename } = query;
	return withUpload(body, { filename, announced }, async (upload) => ({
		jobId: await importKeepOut(params.id, query, upload, access)
	}));
});
