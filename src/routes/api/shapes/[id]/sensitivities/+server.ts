import { operations } from '$lib/api/contract';
import { withUpload } from '$lib/server/content/upload';
import { uploadOf } from '$lib/server/http/files';
import { handle } from '$lib/server/http/handle';
import { checkMapImport, importMap } from '$lib/server/services/maps';

export const POST = handle(operations.importMap, async ({ params, query, access, event }) => {
	const checked = await checkMapImport(params.id, query);
	const { body, announced } = uploadOf(event);
	const { filename } = query;
	return withUpload(body, { filename, announced }, async (upload) => ({
		jobId: await importMap(checked, upload, access)
	}));
});
