import { operations } from '$lib/api/contract';
import { handle } from '$lib/server/http/handle';
import { boxService } from '$lib/server/services/boxes';

export const POST = handle(operations.restoreBox, ({ access, params }) => boxService.restore(access, params.id));
