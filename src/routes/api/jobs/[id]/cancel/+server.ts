import { operations } from '$lib/api/contract';
import { handle } from '$lib/server/http/handle';
import { cancelJob } from '$lib/server/services/jobs';

export const POST = handle(operations.cancelJob, ({ params, access }) => cancelJob(params.id, access));
