import { operations } from '$lib/api/contract';
import { handle } from '$lib/server/http/handle';
import { lockService } from '$lib/server/services/locks';

export const POST = handle(operations.createLock, ({ access, body }) => lockService.create(access, body));
