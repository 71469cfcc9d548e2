import { operations } from '$lib/api/contract';
import { handle } from '$lib/server/http/handle';
import { keepOutService } from '$lib/server/services/keep-outs';

export const POST = handle(operations.createKeepOut, ({ access, body }) => keepOutService.create(access, body));
