import { operations } from '$lib/api/contract';
import { handle } from '$lib/server/http/handle';
import { createBox } from '$lib/server/services/boxes';

export const POST = handle(operations.createBox, ({ access, body }) => createBox(access, body));
