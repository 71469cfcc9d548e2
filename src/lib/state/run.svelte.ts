import { asProblem, type ApiProblem } from '$lib/api/client';
import type { Job } from '$lib/api/schemas/jobs';
import { JobCancelled, watchJob } from './jobs';
import { sendFile } from './upload';

export type RunState = 'idle' | 'sending' | 'working' | 'done' | 'failed' | 'cancelled';

/**
 * One long action as a page shows it: a file on its way, then the job that reads it; or a job alone. Progress is 0..1 within
 * the current phase, `null` while it is not known.
 */
export class Run {
	state = $state<RunState>('idle');
	progress = $state<number | null>(null);
	message = $state('');
	problem = $state.raw<ApiProblem | null>(null);
	job = $state.raw<Job | null>(null);
	#abort: AbortController | null = null;

	get busy() {
		return this.state === 'sending' || this.state === 'working';
	}

	/** Sends `file` to `url` and follows its job. Resolves with the finished job, or `null` when it failed or was cancelled. */
	upload(url: string, file: File): Promise<Job | null> {
		return this.#go('sending', `Sending ${file.name}`, async (signal) => {
			const jobId = await sendFile(url, file, { signal, onProgress: (share) => (this.progress = share) });
			return this.#watch(jobId, signal);
		});
	}

	/** Starts a job with `start` (which answers its id) and follows it. As `upload`. */
	follow(message: string, start: () => Promise<string>): Promise<Job | null> {
		return this.#go('working', message, async (signal) => this.#watch(await start(), signal));
	}

	cancel() {
		this.message = 'Cancelling';
		this.#abort?.abort();
	}

	reset() {
		if (this.busy) return;
		this.state = 'idle';
		this.progress = this.problem = this.job = null;
		this.message = '';
	}

	#watch(jobId: string, signal: AbortSignal) {
		this.state = 'working';
		this.progress = null;
		this.message = 'Waiting for a worker';
		return watchJob(jobId, {
			signal,
			onProgress: (job) => {
				this.job = job;
				if (job.state === 'running') this.progress = job.progress;
				if (job.message && !signal.aborted) this.message = job.message;
			}
		});
	}

	async #go(first: RunState, message: string, work: (signal: AbortSignal) => Promise<Job>): Promise<Job | null> {
		if (this.busy) return null;
		this.#abort = new AbortController();
		this.problem = this.job = null;
		this.progress = null;
		this.message = message;
		this.state = first;
		try {
			this.job = await work(this.#abort.signal);
			this.state = 'done';
			return this.job;
		} catch (cause) {
			if (cause instanceof JobCancelled) {
				this.state = 'cancelled';
				this.message = cause.message;
			} else {
				this.problem = asProblem(cause);
				this.state = 'failed';
			}
			return null;
		}
	}
}
