import { operations } from '$lib/api/contract';
import { handle } from '$lib/server/http/handle';
import { updateObjective } from '$lib/server/services/studies';

export const PATCH = handle(operations.updateObjective, ({ access, params, body }) =>
	updateObjective(access, params.id, body)
);
