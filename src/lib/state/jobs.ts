import { api, apiPath, ApiProblem } from '$lib/api/client';
import type { Job } from '$lib/api/schemas/jobs';

/** Thrown when a job was cancelled, by whomever. */
export class JobCancelled extends Error {
	override readonly name = 'JobCancelled';
	constructor(readonly job: Job | null) {
		super('Cancelled. Nothing of it was kept.');
	}
}

const over = (job: Job) => job.state === 'done' || job.state === 'failed' || job.state === 'cancelled';
const POLL_MS = 1000;

/**
 * Follows a job over server-sent events until it is over. Resolves with the finished job; throws `ApiProblem` with the
 * job's own error when it failed, `JobCancelled` when it was cancelled. Aborting `signal` asks the server to cancel.
 * When the event stream cannot be held (a proxy that buffers), the job is asked for once a second instead.
 */
export async function watchJob(
	jobId: string,
	options: { onProgress?: (job: Job) => void; signal?: AbortSignal } = {}
): Promise<Job> {
	const { onProgress, signal } = options;
	const job = await new Promise<Job>((resolve, reject) => {
		const source = new EventSource(apiPath('watchJob', { id: jobId }));
		let timer: ReturnType<typeof setTimeout> | undefined;

		const stop = () => {
			source.close();
			clearTimeout(timer);
			signal?.removeEventListener('abort', cancel);
		};
		const seen = (next: Job) => {
			onProgress?.(next);
			if (!over(next)) return false;
			stop();
			resolve(next);
			return true;
		};
		const fail = (cause: unknown) => {
			stop();
			reject(cause);
		};
		const poll = async () => {
			try {
				if (!seen(await api.getJob({ id: jobId }))) timer = setTimeout(() => void poll(), POLL_MS);
			} catch (cause) {
				// No connection for the moment: keep asking. A refusal is final.
				if (cause instanceof ApiProblem) fail(cause);
				else timer = setTimeout(() => void poll(), POLL_MS);
			}
		};
		const cancel = () => {
			api.cancelJob({ id: jobId }).then(seen, fail);
		};

		source.onmessage = (event: MessageEvent<string>) => seen(JSON.parse(event.data) as Job);
		source.onerror = () => {
			if (source.readyState === EventSource.CLOSED) void poll();
		};
		if (signal?.aborted) cancel();
		else signal?.addEventListener('abort', cancel, { once: true });
	});
	if (job.state === 'cancelled') throw new JobCancelled(job);
	if (job.state === 'failed') {
		throw new ApiProblem(
			job.error ?? {
				type: 'about:blank',
				title: 'The job failed',
				status: 500,
				code: 'unexpected',
				detail: job.message || 'The job ended without saying why.'
			}
		);
	}
	return job;
}
