/** What the jobs in worker threads have in common: whose they are, and the one transaction in which they end. */
import type { Actor } from '../../auth/caller';
import { endJob, holdJob, type ClaimedJob } from '../../repositories/jobs';
import { inTransaction, type Tx } from '../../repositories/transaction';
import { Stopped, type Control } from '../control';

/** Another worker has the job, or it has ended: whatever this one did is rolled back. */
export class NotOurs extends Error {
	override readonly name = 'NotOurs';
	constructor(jobId: string) {
		super(`Job ${jobId} is no longer this worker’s.`);
	}
}

export interface JobTask {
	job: ClaimedJob;
	control: Control;
}

/** Who asked for the job. */
export const actorOf = (job: ClaimedJob): Actor => job.payload.actor as Actor;

/**
 * Stores what the job made, and with it that the job is done: both or neither, and only while the job is this worker's. So a
 * job that runs twice is stored once.
 *
 * @param write stores everything large; slow, and without locks that others wait for
 * @param finish writes the rows; the job's row is locked from here on
 * @returns what finish returned, which is the job's result
 * @throws NotOurs, Stopped
 */
export function storeAndEnd<T>(
	{ job, control }: JobTask,
	message: string,
	write: (tx: Tx) => Promise<T>,
	finish: (tx: Tx, written: T) => Promise<Record<string, unknown>>
): Promise<void> {
	return inTransaction(async (tx) => {
		const written = await write(tx);
		control.check();
		const held = await holdJob(job, tx);
		if (!held) throw new NotOurs(job.jobId);
		if (held.cancel) throw new Stopped('cancelled');
		const result = await finish(tx, written);
		await endJob(job.jobId, { state: 'done', message, result }, tx);
	});
}
