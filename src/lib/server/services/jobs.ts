/** Jobs as pages and programs see them. */
import { randomUUID } from 'node:crypto';
import type { Job } from '$lib/api/schemas/jobs';
import type { Actor } from '../auth/caller';
import { removeContents } from '../content/store';
import { AppError } from '../errors';
import { jobsRuntime } from '../jobs/runtime';
import { recordEvent } from '../repositories/audit';
import * as jobs from '../repositories/jobs';
import { inTransaction, type Tx } from '../repositories/transaction';

/** Changes that follow each other more quickly are told together. */
const QUIET_MS = 100;
/** A watcher looks by itself when it is told nothing for so long. */
const LOOK_MS = 10_000;

const ENDED: readonly Job['state'][] = ['done', 'failed', 'cancelled'];

export const isEnded = (job: Pick<Job, 'state'>): boolean => ENDED.includes(job.state);

function jobView(row: jobs.JobRow): Job {
	return {
		id: row.id,
		kind: row.kind,
		studyId: row.studyId,
		state: row.state,
		progress: row.progress,
		message: row.message,
		...(row.result && { result: row.result }),
		...(row.error && { error: row.error }),
		createdAt: row.createdAt.toISOString()
	};
}

export interface NewJob {
	kind: Job['kind'];
	studyId: string;
	actor: Actor;
	/** What the job needs besides: `uploadId` names a content that goes with the job unless it is done. */
	payload: Record<string, unknown> & { uploadId?: string };
}

/** Makes a job and queues it in the caller's transaction. */
export async function queueJob({ kind, studyId, actor, payload }: NewJob, tx: Tx): Promise<string> {
	const id = randomUUID();
	const row = { id, kind, studyId, payload: { ...payload, actor }, createdBy: actor.userId };
	await jobs.insertJob(row, 'Waiting for a worker', tx);
	await jobsRuntime().queue.put(id, tx);
	return id;
}

async function requireJob(id: string): Promise<jobs.JobRow> {
	const row = await jobs.findJob(id);
	if (!row) throw new AppError('not-found', 'There is no such job.');
	return row;
}

/** @throws AppError not-found */
export async function getJob(id: string): Promise<Job> {
	return jobView(await requireJob(id));
}

/**
 * Stops a job. One that waits is cancelled at once; a running one is told to stop and says so when it has; one that has ended
 * stays as it is.
 *
 * @throws AppError not-found
 */
export async function cancelJob(id: string, actor: Actor): Promise<Job> {
	await inTransaction(async (tx) => {
		const row = await jobs.lockJob(id, tx);
		if (!row || isEnded(row) || row.cancelRequested) return;
		await jobs.requestCancel(id, tx);
		if (row.state === 'queued') {
			await jobs.endJob(id, { state: 'cancelled', message: 'Cancelled' }, tx);
			await jobsRuntime().queue.drop(id, tx);
			if (typeof row.payload.uploadId === 'string') await removeContents([row.payload.uploadId], tx);
		}
		await recordEvent(tx, actor, { studyId: row.studyId, action: 'job.cancelled', subjectId: id });
	});
	return getJob(id);
}

/**
 * The job as it is now and after each change until it has ended.
 *
 * @param signal ends it
 * @throws AppError not-found
 */
export async function* watchJob(id: string, signal?: AbortSignal): AsyncGenerator<Job, void> {
	const { listener } = jobsRuntime();
	let changed: boolean;
	let ring = () => {};
	const end = listener.on('planish_jobs', (told) => {
		if (told !== null && told !== id) return;
		changed = true;
		ring();
	});
	const onAbort = () => ring();
	signal?.addEventListener('abort', onAbort);
	try {
		let last = '';
		while (!signal?.aborted) {
			changed = false;
			const job = await getJob(id);
			const text = JSON.stringify(job);
			if (text !== last) yield job;
			last = text;
			if (isEnded(job)) return;
			await pause(QUIET_MS);
			if (!changed && !signal?.aborted) await pause(LOOK_MS, (wake) => (ring = wake));
		}
	} finally {
		end();
		signal?.removeEventListener('abort', onAbort);
	}
}

/** @param early gets a function that ends the pause */
function pause(ms: number, early?: (wake: () => void) => void): Promise<void> {
	return new Promise((resolve) => {
		const timer = setTimeout(resolve, ms);
		early?.(() => {
			clearTimeout(timer);
			resolve();
		});
	});
}

/** @returns the job when it has ended */
export async function waitForJob(id: string): Promise<Job> {
	for await (const job of watchJob(id)) if (isEnded(job)) return job;
	return getJob(id);
}
