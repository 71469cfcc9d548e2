import { operations } from '$lib/api/contract';
import { handle } from '$lib/server/http/handle';
import { createToken, listTokens } from '$lib/server/services/tokens';

export const GET = handle(operations.listTokens, ({ access }) => listTokens(access));
export const POST = handle(operations.createToken, ({ access, body }) => createToken(access, body));
