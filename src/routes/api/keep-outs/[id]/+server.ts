import { operations } from '$lib/api/contract';
import { handle } from '$lib/server/http/handle';
import { keepOutService, replaceKeepOut } from '$lib/server/services/keep-outs';

export const PUT = handle(operations.replaceKeepOut, ({ access, params, body }) =>
	replaceKeepOut(access, params.id, body)
);
export const DELETE = handle(operations.removeKeepOut, ({ access, params }) =>
	keepOutService.remove(access, params.id)
);
