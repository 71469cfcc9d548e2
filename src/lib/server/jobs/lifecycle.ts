/** How a job ends or waits again. Every change locks the job's row first and leaves alone what is no longer as it was. */
import { removeContents } from '../content/store';
import { AppError, toProblem } from '../errors';
import { log } from '../log';
import * as jobs from '../repositories/jobs';
import { inTransaction, type Tx } from '../repositories/transaction';
import type { Queue } from './queue';

/** How often a job is tried when its workers are lost. */
export const ATTEMPTS = 3;
/** A worker whose heart has not beaten for so long is lost. */
export const LOST_SECONDS = 15;

/** The content that waits for the job; of no use once the job has failed. */
function uploadOf(payload: Record<string, unknown>): string[] {
	return typeof payload.uploadId === 'string' ? [payload.uploadId] : [];
}

/** Ends a job with nothing of it left. */
async function endEmpty(job: { id: string; payload: Record<string, unknown> }, ending: jobs.Ending, tx: Tx) {
	await jobs.endJob(job.id, ending, tx);
	await removeContents(uploadOf(job.payload), tx);
}

const cancelledEnding = { state: 'cancelled', message: 'Cancelled' } as const;

/** The job's own worker says that it was refused or failed. */
export async function failJob(job: jobs.ClaimedJob, thrown: unknown): Promise<void> {
	const error = toProblem(thrown);
	await inTransaction(async (tx) => {
		if (!(await jobs.holdJob(job, tx))) return;
		await endEmpty({ id: job.jobId, payload: job.payload }, { state: 'failed', message: error.title, error }, tx);
	});
}

/** The job's own worker has stopped because it was told to. */
export async function endCancelled(job: jobs.ClaimedJob): Promise<void> {
	await inTransaction(async (tx) => {
		if (await jobs.holdJob(job, tx)) await endEmpty({ id: job.jobId, payload: job.payload }, cancelledEnding, tx);
	});
}

/** Gives a job back that its worker did not finish, through no fault of the job. */
export async function giveBack(
	queue: Queue,
	job: jobs.ClaimedJob,
	why: 'shutdown' | 'crash' | 'database'
): Promise<void> {
	await inTransaction(async (tx) => {
		const held = await jobs.holdJob(job, tx);
		if (held) await again(queue, { ...job, id: job.jobId, attempts: job.attempt, ...held }, why, tx);
	});
}

type Unfinished = { id: string; payload: Record<string, unknown>; attempts: number; cancel: boolean };

async function again(
	queue: Queue,
	job: Unfinished,
	why: 'shutdown' | 'crash' | 'database' | 'lost',
	tx: Tx
): Promise<void> {
	if (job.cancel) return endEmpty(job, cancelledEnding, tx);
	if (why !== 'shutdown' && job.attempts >= ATTEMPTS) {
		const error = toProblem(
			new AppError('internal', `The worker ended before the job was done, ${job.attempts} times.`, {
				mend: 'The input may need more memory than the server has. The server’s log says how each attempt ended.'
			})
		);
		return endEmpty(job, { state: 'failed', message: error.title, error }, tx);
	}
	await jobs.waitAgain(job.id, 'Waiting for a worker', { uncounted: why === 'shutdown' }, tx);
	await queue.put(job.id, tx);
}

/** Looks for jobs whose worker is gone, and for waiting ones that the queue has lost sight of. */
export async function rescueJobs(queue: Queue, queueName: string, mine: ReadonlySet<string>): Promise<void> {
	await inTransaction(async (tx) => {
		for (const job of await jobs.findLost(LOST_SECONDS, tx)) {
			if (mine.has(job.id)) continue;
			log.warn({ jobId: job.id, worker: job.worker, attempt: job.attempts }, 'a worker was lost');
			await again(
				queue,
				{ id: job.id, payload: job.payload, attempts: job.attempts, cancel: job.cancelRequested },
				'lost',
				tx
			);
		}
		for (const id of await jobs.findForgotten(queueName, LOST_SECONDS, tx)) await queue.put(id, tx);
	});
}
