import { operations } from '$lib/api/contract';
import { handle } from '$lib/server/http/handle';
import { createUser, listUsers } from '$lib/server/services/users';

export const GET = handle(operations.listUsers, () => listUsers());
export const POST = handle(operations.createUser, ({ access, body }) => createUser(access, body));
