import { operations } from '$lib/api/contract';
import { handle } from '$lib/server/http/handle';
import { lockService } from '$lib/server/services/locks';

export const PUT = handle(operations.replaceLock, ({ access, params, body: { version, ...definition } }) =>
	lockService.replace(access, params.id, definition, { basedOn: version })
);
export const DELETE = handle(operations.removeLock, ({ access, params }) => lockService.remove(access, params.id));
