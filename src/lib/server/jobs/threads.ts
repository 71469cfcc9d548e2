/** Pools of worker threads. They are made when first needed, since the build imports this module too. */
import { resolve } from 'node:path';
import { Piscina } from 'piscina';
import { log } from '../log';
import type { ThreadOutcome, ThreadTask } from './protocol';

/** A thread that is not needed for so long ends; its caches go with it. */
const IDLE_MS = 10 * 60_000;
/** A thread needs few connections: it reads ahead by one query. */
const CONNECTIONS = '3';

export class Threads {
	#pool: Piscina | undefined;

	/** @param size largest number of threads */
	constructor(
		readonly name: string,
		readonly size: number
	) {}

	#open(): Piscina {
		if (this.#pool) return this.#pool;
		const folder = process.env.PLANISH_WORKER_DIR ?? resolve('build', 'workers');
		const pool = new Piscina({
			filename: resolve(folder, 'job-thread.mjs'),
			minThreads: 0,
			maxThreads: this.size,
			idleTimeout: IDLE_MS,
			env: { ...process.env, PLANISH_DB_CONNECTIONS: CONNECTIONS },
			recordTiming: false
		});
		// Without a listener, a thread that cannot be loaded would end the process.
		pool.on('error', (error: unknown) => log.error({ err: error, pool: this.name }, 'a worker thread failed'));
		this.#pool = pool;
		return pool;
	}

	/**
	 * Runs a task in a free thread; waits for one when all are busy.
	 *
	 * @param signal aborting it takes a waiting task out and ends the thread of a running one
	 * @throws Error when the thread ended unexpectedly
	 */
	run(task: ThreadTask, signal?: AbortSignal): Promise<ThreadOutcome> {
		const transferList = task.kind === 'file' ? [task.port] : [];
		return this.#open().run(task, { transferList, signal });
	}

	/** Ends all threads, whatever they do. */
	async close(): Promise<void> {
		await this.#pool?.destroy();
		this.#pool = undefined;
	}
}
