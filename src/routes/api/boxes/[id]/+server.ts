import { operations } from '$lib/api/contract';
import { handle } from '$lib/server/http/handle';
import { removeBox, replaceBox } from '$lib/server/services/boxes';

export const PUT = handle(operations.replaceBox, ({ access, params, body }) => replaceBox(access, params.id, body));
export const DELETE = handle(operations.removeBox, ({ access, params }) => removeBox(access, params.id));
