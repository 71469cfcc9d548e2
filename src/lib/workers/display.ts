/** The page's end of the display worker: a promise for each request. */
import type { DisplayCall, DisplayInput, DisplayOutput, DisplayReply, DisplayRequest } from './display-protocol';

interface Waiting {
	resolve: (output: never) => void;
	reject: (cause: Error) => void;
}

export class DisplayWorker {
	#worker: Worker | null = null;
	#next = 1;
	readonly #waiting = new Map<number, Waiting>();

	/** `transfer`: buffers of the input that go over without a copy; they are empty here afterwards. */
	ask<K extends DisplayCall>(
		call: K,
		input: DisplayInput<K>,
		transfer: Transferable[] = []
	): Promise<DisplayOutput<K>> {
		const worker = (this.#worker ??= this.#start());
		const id = this.#next++;
		return new Promise<DisplayOutput<K>>((resolve, reject) => {
			this.#waiting.set(id, { resolve: resolve as Waiting['resolve'], reject });
			worker.postMessage({ id, call, input } satisfies DisplayRequest<K>, transfer);
		});
	}

	/** The page was left: what was asked is wanted by nobody any more and stays unanswered. */
	close() {
		this.#worker?.terminate();
		this.#worker = null;
		this.#waiting.clear();
	}

	#start(): Worker {
		const worker = new Worker(new URL('./display.worker.ts', import.meta.url), { type: 'module' });
		worker.onmessage = ({ data }: MessageEvent<DisplayReply>) => {
			const waiting = this.#waiting.get(data.id);
			this.#waiting.delete(data.id);
			if ('error' in data) waiting?.reject(new Error(data.error));
			else waiting?.resolve(data.output as never);
		};
		// After a fault its state cannot be trusted: it goes, and the next request gets a new one.
		worker.onerror = (event) => this.#fail(new Error(event.message || 'The display worker could not be started.'));
		return worker;
	}

	#fail(cause: Error) {
		this.#worker?.terminate();
		this.#worker = null;
		for (const { reject } of this.#waiting.values()) reject(cause);
		this.#waiting.clear();
	}
}
