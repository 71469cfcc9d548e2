/** Takes jobs from the queue into worker threads, keeps their rows informed, and looks after jobs whose workers are gone. */
import { randomUUID } from 'node:crypto';
import { hostname } from 'node:os';
import { setTimeout as sleep } from 'node:timers/promises';
import type { Listener } from '../db/listener';
import { sweep } from '../content/store';
import { AppError } from '../errors';
import { log } from '../log';
import { beat, claimJob, type ClaimedJob } from '../repositories/jobs';
import { Control } from './control';
import { endCancelled, failJob, giveBack, rescueJobs } from './lifecycle';
import type { ThreadOutcome } from './protocol';
import { QUEUE, type Queue } from './queue';
import type { Threads } from './threads';

const LOOK_MS = 2000;
const REPORT_MS = 500;
/** A job that makes no progress still shows that it lives, and learns that it is cancelled. */
const BEAT_MS = 1000;
const RESCUE_MS = 5000;
const SWEEP_MS = 15 * 60_000;
/** A thread that does not come to a checkpoint for so long after it was told to stop is ended. */
const STOP_MS = 30_000;
const SHUTDOWN_MS = 6000;

export class Supervisor {
	readonly #worker = `${hostname()}:${process.pid}:${randomUUID().slice(0, 8)}`;
	readonly #running = new Map<string, Control>();
	readonly #loops: Promise<void>[] = [];
	readonly #timers: NodeJS.Timeout[] = [];
	readonly #ended = new AbortController();
	#wake = new AbortController();
	#unlisten = () => {};

	constructor(
		readonly queue: Queue,
		readonly threads: Threads,
		readonly listener: Listener
	) {}

	/** Begins to take jobs, as many at once as there are threads. */
	start(): void {
		this.#unlisten = this.listener.on('planish_queue', () => this.#ring());
		for (let i = 0; i < this.threads.size; i++) this.#loops.push(this.#serve());
		const every = (ms: number, what: () => Promise<unknown>) => {
			const turn = () => void what().catch((error) => log.warn({ err: error }, 'a supervisor’s round failed'));
			this.#timers.push(setInterval(turn, ms).unref());
			turn();
		};
		every(RESCUE_MS, () => rescueJobs(this.queue, QUEUE, new Set(this.#running.keys())));
		every(SWEEP_MS, sweep);
	}

	#ring() {
		this.#wake.abort();
		this.#wake = new AbortController();
	}

	async #serve(): Promise<void> {
		while (!this.#ended.signal.aborted) {
			// Taken before looking: a ring between the look and the wait is not missed.
			const { signal } = this.#wake;
			const jobId = await this.queue.take().catch((error) => {
				log.warn({ err: error }, 'the queue cannot be read');
				return null;
			});
			if (jobId) await this.#work(jobId).catch((error) => log.error({ err: error, jobId }, 'a job was left behind'));
			else await sleep(LOOK_MS, undefined, { signal }).catch(() => undefined);
		}
	}

	async #work(jobId: string): Promise<void> {
		const control = new Control();
		const job = await claimJob(jobId, this.#worker, control.state.message);
		if (job) {
			this.#running.set(jobId, control);
			if (this.#ended.signal.aborted) control.stop('shutdown');
			try {
				if (await this.#run(job, control)) return;
			} finally {
				this.#running.delete(jobId);
			}
		}
		await this.queue.finish(jobId);
	}

	/** @returns whether the job was given back */
	async #run(job: ClaimedJob, control: Control): Promise<boolean> {
		const kill = new AbortController();
		const stopHeart = this.#keepInformed(job, control, kill);
		let outcome: ThreadOutcome | null = null;
		try {
			outcome = await this.threads.run({ kind: 'job', job, control: control.buffer }, kill.signal);
		} catch (error) {
			if (!control.stopped) log.error({ err: error, jobId: job.jobId }, 'a worker thread ended unexpectedly');
		} finally {
			stopHeart();
		}
		const why = control.stopped;
		if (outcome?.outcome === 'refused') {
			const { code, detail, options } = outcome.refusal;
			if (code === 'unavailable') {
				await giveBack(this.queue, job, 'database');
				return true;
			}
			await failJob(job, new AppError(code, detail, options));
		} else if (!outcome || outcome.outcome === 'stopped') {
			if (why !== 'cancelled') {
				await giveBack(this.queue, job, why ?? 'crash');
				return true;
			}
			await endCancelled(job);
		}
		return false;
	}

	/** Heartbeat, progress and the wish to cancel, until the returned function is called. */
	#keepInformed(job: ClaimedJob, control: Control, kill: AbortController): () => void {
		let told = '';
		let toldAt = 0;
		let busy = false;
		let stopTimer: NodeJS.Timeout | undefined;
		const stop = () => {
			control.stop('cancelled');
			stopTimer ??= setTimeout(() => kill.abort(), STOP_MS).unref();
		};
		const report = async () => {
			const { progress, message } = control.state;
			// Hundredths are enough for a bar, and spare the listeners.
			const now = { progress: Math.floor(100 * progress) / 100, message };
			const text = JSON.stringify(now);
			const changed = text !== told;
			if (!changed && Date.now() - toldAt < BEAT_MS) return;
			const cancel = await beat(job, changed ? now : undefined);
			told = text;
			toldAt = Date.now();
			if (cancel !== false) stop();
		};
		const timer = setInterval(() => {
			if (busy) return;
			busy = true;
			void report()
				.catch((error) => log.warn({ err: error, jobId: job.jobId }, 'no heartbeat'))
				.finally(() => (busy = false));
		}, REPORT_MS);
		return () => {
			clearInterval(timer);
			clearTimeout(stopTimer);
		};
	}

	/** Gives unfinished jobs back to the queue and ends the threads. */
	async stop(): Promise<void> {
		this.#ended.abort();
		this.#unlisten();
		for (const timer of this.#timers) clearInterval(timer);
		for (const control of this.#running.values()) control.stop('shutdown');
		this.#ring();
		const all = Promise.all(this.#loops);
		const late = new AbortController();
		await Promise.race([all, sleep(SHUTDOWN_MS, undefined, { signal: late.signal }).catch(() => undefined)]);
		late.abort();
		await this.threads.close();
		await all;
	}
}
