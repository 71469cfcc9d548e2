import { operations } from '$lib/api/contract';
import { eventResponse } from '$lib/server/http/events';
import { handle } from '$lib/server/http/handle';
import { jobsRuntime } from '$lib/server/jobs/runtime';
import { watchJob } from '$lib/server/services/jobs';

export const GET = handle(operations.watchJob, ({ params }) =>
	eventResponse((signal) => watchJob(params.id, signal), jobsRuntime().closing.signal)
);
