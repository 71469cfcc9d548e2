import { operations } from '$lib/api/contract';
import { handle } from '$lib/server/http/handle';
import { boxService } from '$lib/server/services/boxes';

export const PUT = handle(operations.replaceBox, ({ access, params, body: { version, ...definition } }) =>
	boxService.replace(access, params.id, definition, { basedOn: version })
);
export const DELETE = handle(operations.removeBox, ({ access, params }) => boxService.remove(access, params.id));
