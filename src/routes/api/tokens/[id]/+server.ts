import { operations } from '$lib/api/contract';
import { handle } from '$lib/server/http/handle';
import { revokeToken } from '$lib/server/services/tokens';

export const DELETE = handle(operations.revokeToken, ({ access, params }) => revokeToken(access, params.id));
