/** Server-sent events (WHATWG HTML, section 9.2). */

/** Proxies close a connection on which nothing moves. */
const COMMENT_MS = 15_000;

/**
 * Sends each value as one event's `data`, as JSON; ends with the values.
 *
 * @param valuesOf is given a signal that is aborted when the reader goes away, or with `until`
 */
export function eventResponse(valuesOf: (signal: AbortSignal) => AsyncIterable<unknown>, until: AbortSignal): Response {
	const gone = new AbortController();
	const signal = AbortSignal.any([gone.signal, until]);
	const encoder = new TextEncoder();
	let timer: NodeJS.Timeout | undefined;
	const body = new ReadableStream<Uint8Array>({
		start(controller) {
			const send = (text: string) => void (signal.aborted || controller.enqueue(encoder.encode(text)));
			timer = setInterval(() => send(': still here\n\n'), COMMENT_MS);
			const run = async () => {
				for await (const value of valuesOf(signal)) send(`data: ${JSON.stringify(value)}\n\n`);
				if (!gone.signal.aborted) controller.close();
			};
			void run()
				.catch((error) => gone.signal.aborted || controller.error(error))
				.finally(() => clearInterval(timer));
		},
		cancel() {
			clearInterval(timer);
			gone.abort();
		}
	});
	return new Response(body, {
		headers: { 'content-type': 'text/event-stream', 'cache-control': 'no-store', 'x-accel-buffering': 'no' }
	});
}
