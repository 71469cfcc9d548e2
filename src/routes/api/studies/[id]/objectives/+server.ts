import { operations } from '$lib/api/contract';
import { handle } from '$lib/server/http/handle';
import { createObjective } from '$lib/server/services/studies';

export const POST = handle(operations.createObjective, ({ access, body }) => createObjective(access, body));
