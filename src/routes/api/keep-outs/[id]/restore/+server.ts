import { operations } from '$lib/api/contract';
import { handle } from '$lib/server/http/handle';
import { keepOutService } from '$lib/server/services/keep-outs';

export const POST = handle(operations.restoreKeepOut, ({ access, params }) =>
	keepOutService.restore(access, params.id)
);
