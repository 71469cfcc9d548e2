import { operations } from '$lib/api/contract';
import { handle } from '$lib/server/http/handle';
import { boxService } from '$lib/server/services/boxes';

export const POST = handle(operations.createBox, ({ access, body }) => boxService.create(access, body));
