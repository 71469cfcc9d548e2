import { operations } from '$lib/api/contract';
import { handle } from '$lib/server/http/handle';
import { getStudy, updateStudy } from '$lib/server/services/studies';

export const GET = handle(operations.getStudy, ({ access }) => getStudy(access));
export const PATCH = handle(operations.updateStudy, ({ access, body }) => updateStudy(access, body));
