import { operations } from '$lib/api/contract';
import { handle } from '$lib/server/http/handle';
import { createStudy, listStudies } from '$lib/server/services/studies';

export const GET = handle(operations.listStudies, ({ access }) => listStudies(access));
export const POST = handle(operations.createStudy, ({ access, body }) => createStudy(access, body));
