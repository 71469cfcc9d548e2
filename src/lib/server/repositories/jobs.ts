/** Queries on jobs. A worker's writes name the worker and its attempt, so that one that was given up changes nothing. */
import { QueryTypes } from 'sequelize';
import type { Problem } from '$lib/api/schemas/common';
import type { Job } from '$lib/api/schemas/jobs';
import { database } from '../db/client';
import { JobModel } from '../db/models/shapes';
import type { Tx } from './transaction';

export type { JobModel as JobRow } from '../db/models/shapes';

/** Who runs a job, and its how many-th run this is. */
export interface Claim {
	jobId: string;
	worker: string;
	attempt: number;
}

export interface ClaimedJob extends Claim {
	kind: Job['kind'];
	studyId: string;
	payload: Record<string, unknown>;
	createdBy: string | null;
}

const OURS = `id = $1 AND state = 'running' AND worker = $2 AND attempts = $3`;
const ours = (claim: Claim) => [claim.jobId, claim.worker, claim.attempt];

export async function insertJob(
	job: { id: string; kind: Job['kind']; studyId: string; payload: Record<string, unknown>; createdBy: string | null },
	message: string,
	tx: Tx
): Promise<void> {
	await JobModel.create({ ...job, message }, { transaction: tx });
}

export async function findJob(id: string, tx?: Tx): Promise<JobModel | null> {
	return JobModel.findByPk(id, { transaction: tx });
}

/** The job, locked until the transaction ends. */
export async function lockJob(id: string, tx: Tx): Promise<JobModel | null> {
	return JobModel.findByPk(id, { transaction: tx, lock: tx.LOCK.UPDATE });
}

/** @returns null when the job does not wait (any more) */
export async function claimJob(id: string, worker: string, message: string): Promise<ClaimedJob | null> {
	const [row] = await database().query<ClaimedJob>(
		`UPDATE jobs SET state = 'running', worker = $2, attempts = attempts + 1, progress = 0, message = $3, heartbeat_at = now()
			WHERE id = $1 AND state = 'queued'
			RETURNING id AS "jobId", worker, attempts AS attempt, kind, study_id AS "studyId", payload, created_by AS "createdBy"`,
		{ bind: [id, worker, message], type: QueryTypes.SELECT }
	);
	return row ?? null;
}

/**
 * Tells that the worker is alive, and how far it is where that changed (listeners are told of every such change).
 *
 * @returns whether the job is to be cancelled; null when it is no longer this worker's
 */
export async function beat(claim: Claim, now?: { progress: number; message: string }): Promise<boolean | null> {
	const change = now ? ', progress = $4, message = $5' : '';
	const [row] = await database().query<{ cancel: boolean }>(
		`UPDATE jobs SET heartbeat_at = now()${change} WHERE ${OURS} RETURNING cancel_requested AS cancel`,
		{ bind: [...ours(claim), ...(now ? [now.progress, now.message] : [])], type: QueryTypes.SELECT }
	);
	return row ? row.cancel : null;
}

/** Locks the job until the transaction ends; false when it is no longer this worker's. */
export async function holdJob(claim: Claim, tx: Tx): Promise<{ cancel: boolean } | null> {
	const [row] = await database().query<{ cancel: boolean }>(
		`SELECT cancel_requested AS cancel FROM jobs WHERE ${OURS} FOR UPDATE`,
		{ bind: ours(claim), type: QueryTypes.SELECT, transaction: tx }
	);
	return row ?? null;
}

export type Ending =
	| { state: 'done'; message: string; result: Record<string, unknown> }
	| { state: 'failed'; message: string; error: Problem }
	| { state: 'cancelled'; message: string };

/** The caller holds the job's row. */
export async function endJob(id: string, ending: Ending, tx: Tx): Promise<void> {
	await JobModel.update(
		{
			state: ending.state,
			message: ending.message,
			finishedAt: new Date(),
			...(ending.state === 'done' && { progress: 1, result: ending.result }),
			...(ending.state === 'failed' && { error: ending.error })
		},
		{ where: { id }, transaction: tx }
	);
}

/** Puts a job back into the queue's waiting room. The caller holds the job's row. */
export async function waitAgain(id: string, message: string, { uncounted = false }, tx: Tx): Promise<void> {
	await database().query(
		`UPDATE jobs SET state = 'queued', worker = NULL, heartbeat_at = NULL, progress = 0, message = $2, attempts = attempts - $3
			WHERE id = $1`,
		{ bind: [id, message, uncounted ? 1 : 0], transaction: tx }
	);
}

export async function requestCancel(id: string, tx: Tx): Promise<void> {
	await JobModel.update({ cancelRequested: true }, { where: { id }, transaction: tx });
}

/** Running jobs whose heart stopped so many seconds ago, locked; those that somebody holds just now are alive. */
export async function findLost(seconds: number, tx: Tx): Promise<JobModel[]> {
	const rows = await database().query<{ id: string }>(
		`SELECT id FROM jobs WHERE state = 'running' AND heartbeat_at < now() - make_interval(secs => $1)
			FOR UPDATE SKIP LOCKED`,
		{ bind: [seconds], type: QueryTypes.SELECT, transaction: tx }
	);
	return JobModel.findAll({ where: { id: rows.map((row) => row.id) }, transaction: tx });
}

/**
 * Waiting jobs that the queue does not hold: its entry was handed to a worker that died before it claimed the job, or was
 * ended by one that had been given up.
 */
export async function findForgotten(queue: string, seconds: number, tx: Tx): Promise<string[]> {
	const rows = await database().query<{ id: string }>(
		`SELECT j.id FROM jobs j WHERE j.state = 'queued' AND j.created_at < now() - make_interval(secs => $2)
			AND NOT EXISTS (
				SELECT FROM pgboss.job b WHERE b.name = $1 AND b.id = j.id
					AND (b.state IN ('created', 'retry') OR b.state = 'active' AND b.started_on > now() - make_interval(secs => $2))
			)
			FOR UPDATE OF j SKIP LOCKED`,
		{ bind: [queue, seconds], type: QueryTypes.SELECT, transaction: tx }
	);
	return rows.map((row) => row.id);
}

/** Wakes the supervisors of all processes once the transaction is committed. */
export async function announceWork(id: string, tx: Tx): Promise<void> {
	await database().query(`SELECT pg_notify('planish_queue', $1)`, { bind: [id], transaction: tx });
}
