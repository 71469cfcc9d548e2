import { operations } from '$lib/api/contract';
import { handle } from '$lib/server/http/handle';
import { updateUser } from '$lib/server/services/users';

export const PATCH = handle(operations.updateUser, ({ access, params, body }) => updateUser(access, params.id, body));
