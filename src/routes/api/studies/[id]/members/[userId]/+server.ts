import { operations } from '$lib/api/contract';
import { handle } from '$lib/server/http/handle';
import { removeMember } from '$lib/server/services/members';

export const DELETE = handle(operations.removeMember, ({ access, params }) => removeMember(access, params.userId));
