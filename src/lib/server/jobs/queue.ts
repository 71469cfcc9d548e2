/** The queue in PostgreSQL (pg-boss). Its entries carry our jobs' ids and nothing else: what is known of a job is its row. */
import PgBoss from 'pg-boss';
import { database } from '../db/client';
import { log } from '../log';
import { announceWork } from '../repositories/jobs';
import type { Tx } from '../repositories/transaction';

export const QUEUE = 'planish';

/** pg-boss speaks through the process's own pool, or inside a given transaction. */
function through(tx?: Tx): PgBoss.Db {
	return {
		async executeSql(text, values) {
			const bind = values?.map((value: unknown) => value ?? null);
			const [rows] = await database().query(text, { bind: bind?.length ? bind : undefined, transaction: tx });
			return { rows };
		}
	};
}

/**
 * One for each process. Entries are fetched and ended by the supervisor itself, since pg-boss's own loop leaves an unanswered
 * promise behind when the database goes away.
 */
export class Queue {
	readonly #boss = new PgBoss({ db: through(), schedule: false, migrate: true });
	#opened: Promise<void> | undefined;

	/** Makes the queue's tables when they are missing; several processes may do so at once. */
	open(): Promise<void> {
		this.#opened ??= this.#open().catch((error) => {
			this.#opened = undefined;
			throw error;
		});
		return this.#opened;
	}

	async #open() {
		// Its maintenance runs on timers; a database that is away for a while must not end the process.
		this.#boss.on('error', (error) => log.warn({ err: error }, 'queue maintenance failed'));
		await this.#boss.start();
		await this.#boss.createQueue(QUEUE, { name: QUEUE });
	}

	/** Puts a job in, or in again, as part of the caller's transaction. */
	async put(jobId: string, tx: Tx): Promise<void> {
		await this.open();
		const db = through(tx);
		await this.#boss.deleteJob(QUEUE, jobId, { db });
		const id = await this.#boss.send(QUEUE, {}, { id: jobId, expireInHours: 23, retryLimit: 0, db });
		if (id !== jobId) throw new Error(`Job ${jobId} could not be queued.`);
		await announceWork(jobId, tx);
	}

	/** @returns the id of the next job, now in our hands, or null */
	async take(): Promise<string | null> {
		const [entry] = await this.#boss.fetch(QUEUE, { batchSize: 1 });
		return entry?.id ?? null;
	}

	/** The job's row says how it ended; the entry only goes. */
	async finish(jobId: string): Promise<void> {
		await this.#boss.complete(QUEUE, jobId);
	}

	/** Takes a waiting job out, as part of the caller's transaction. */
	async drop(jobId: string, tx: Tx): Promise<void> {
		await this.open();
		await this.#boss.deleteJob(QUEUE, jobId, { db: through(tx) });
	}

	async close(): Promise<void> {
		if (!this.#opened) return;
		await this.#opened.catch(() => undefined);
		await this.#boss.stop({ graceful: false, close: false, wait: true });
	}
}
