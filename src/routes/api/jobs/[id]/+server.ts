import { operations } from '$lib/api/contract';
import { handle } from '$lib/server/http/handle';
import { getJob } from '$lib/server/services/jobs';

export const GET = handle(operations.getJob, ({ params }) => getJob(params.id));
