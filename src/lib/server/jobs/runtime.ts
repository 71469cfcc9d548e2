/**
 * What a process keeps for its jobs: the queue, the listening connection, the threads. There is one of it in a process, also
 * when a development server loads this module anew.
 */
import { clearUploads } from '../content/upload';
import { Listener } from '../db/listener';
import { log } from '../log';
import { Control } from './control';
import { Queue } from './queue';
import { Supervisor } from './supervisor';
import { Threads } from './threads';

/** Threads that work on jobs when PLANISH_THREADS does not say. */
const DEFAULT_THREADS = 2;

export class JobsRuntime {
	readonly queue = new Queue();
	readonly listener = new Listener((error) => log.warn({ err: error }, 'the listening connection was lost'));
	/** One thread, so that it keeps what it prepared for the last previews. */
	readonly previews = new Threads('previews', 1);
	readonly files = new Threads('files', 1);
	/** Aborted when the process is about to end: streams that would go on for ever end. */
	readonly closing = new AbortController();
	supervisor: Supervisor | undefined;
}

const KEY = Symbol.for('planish.jobs');
const holder = globalThis as { [KEY]?: JobsRuntime };

export function jobsRuntime(): JobsRuntime {
	return (holder[KEY] ??= new JobsRuntime());
}

function threadCount(): number {
	const text = process.env.PLANISH_THREADS;
	if (text === undefined || text === '') return DEFAULT_THREADS;
	const count = Number(text);
	if (!Number.isInteger(count) || count < 0 || count > 64) {
		throw new Error(`PLANISH_THREADS is "${text}". It must be a whole number from 0 to 64.`);
	}
	return count;
}

/**
 * Opens the queue and begins to work on jobs in worker threads; with PLANISH_THREADS=0 it leaves them to other processes.
 * Called once when a server or a worker starts; again, it does nothing.
 */
export async function startJobs(): Promise<void> {
	const runtime = jobsRuntime();
	if (runtime.supervisor) return;
	const { queue, listener } = runtime;
	runtime.supervisor = new Supervisor(queue, new Threads('jobs', threadCount()), listener);
	await clearUploads();
	await queue.open();
	await listener.open();
	runtime.supervisor.start();
	log.info({ threads: runtime.supervisor.threads.size }, 'ready for jobs');
}

/** Starts the preview thread before anybody waits for it: loading its code takes as long as a small preview. */
export async function warmPreviews(): Promise<void> {
	await jobsRuntime()
		.previews.run({ kind: 'warm', control: new Control().buffer })
		.catch((error) => log.error({ err: error }, 'the preview thread could not be started'));
}

/** Ends the streams of those who watch jobs. */
export function endStreams(): void {
	holder[KEY]?.closing.abort();
}

/** Gives unfinished jobs back and ends the threads and connections of startJobs. */
export async function stopJobs(): Promise<void> {
	const runtime = holder[KEY];
	if (!runtime) return;
	delete holder[KEY];
	runtime.closing.abort();
	await runtime.supervisor?.stop();
	await Promise.all([runtime.previews.close(), runtime.files.close(), runtime.listener.close()]);
	await runtime.queue.close();
}
