import { operations } from '$lib/api/contract';
import { handle } from '$lib/server/http/handle';
import { restoreBox } from '$lib/server/services/boxes';

export const POST = handle(operations.restoreBox, ({ access, params }) => restoreBox(access, params.id));
