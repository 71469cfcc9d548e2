/** One connection for each process that listens to what the database tells: jobs that changed, work that waits. */
import pg from 'pg';

const RETRY_MS = 1000;

export type Told = (jobId: string | null) => void;

export class Listener {
	readonly #told: Record<'planish_jobs' | 'planish_queue', Set<Told>> = {
		planish_jobs: new Set(),
		planish_queue: new Set()
	};
	#client: pg.Client | undefined;
	#timer: NodeJS.Timeout | undefined;
	#open = false;

	/** @param onLost told each time the connection is lost, to log it */
	constructor(readonly onLost: (error: Error | undefined) => void) {}

	/** Connects, and connects again whenever the connection is lost. */
	async open(): Promise<void> {
		if (this.#open) return;
		this.#open = true;
		await this.#connect();
	}

	async #connect(): Promise<void> {
		const client = new pg.Client({
			connectionString: process.env.DATABASE_URL,
			application_name: 'planish listener',
			keepAlive: true
		});
		this.#client = client;
		let lost = false;
		const again = (error?: Error) => {
			if (lost) return;
			lost = true;
			client.end().catch(() => undefined);
			if (!this.#open || this.#client !== client) return;
			this.onLost(error);
			this.#timer = setTimeout(() => void this.#connect(), RETRY_MS);
		};
		client.on('error', again);
		client.on('end', () => again());
		client.on('notification', ({ channel, payload }) => this.#tell(channel, payload ?? null));
		try {
			await client.connect();
			await client.query('LISTEN planish_jobs; LISTEN planish_queue');
			// What was told in between was missed: everybody looks again.
			this.#tell('planish_jobs', null);
			this.#tell('planish_queue', null);
		} catch (error) {
			again(error as Error);
		}
	}

	#tell(channel: string, jobId: string | null) {
		for (const told of this.#told[channel as 'planish_jobs'] ?? []) told(jobId);
	}

	/**
	 * @param told called with the job's id, or with null when any may have changed
	 * @returns a function that ends it
	 */
	on(channel: 'planish_jobs' | 'planish_queue', told: Told): () => void {
		this.#told[channel].add(told);
		return () => this.#told[channel].delete(told);
	}

	async close(): Promise<void> {
		this.#open = false;
		clearTimeout(this.#timer);
		const client = this.#client;
		this.#client = undefined;
		await client?.end().catch(() => undefined);
	}
}
