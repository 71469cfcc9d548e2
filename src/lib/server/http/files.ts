/** Files as answers, and the bytes that come in with a request. */
import type { IncomingMessage } from 'node:http';
import type { RequestEvent } from '@sveltejs/kit';
import type { FileAnswer } from '../services/files';

/** Only a member may have it, and it never changes. */
const CACHE = 'private, max-age=31536000, immutable';

/**
 * Sends a file; 304 when the browser has it. The first piece is made before the answer begins, so that a file that cannot be
 * read gives a problem and not half a file; a later fault breaks the connection off.
 */
export async function fileResponse(event: RequestEvent, file: FileAnswer): Promise<Response> {
	const headers = new Headers({ etag: file.etag, 'cache-control': CACHE, vary: 'Authorization, Cookie' });
	const known = event.request.headers.get('if-none-match');
	if (known && known.split(',').some((tag) => tag.trim().replace(/^W\//, '') === file.etag)) {
		return new Response(null, { status: 304, headers });
	}
	headers.set('content-type', file.type);
	headers.set('x-content-type-options', 'nosniff');
	if (file.size !== undefined) headers.set('content-length', String(file.size));
	if (file.filename) headers.set('content-disposition', disposition(file.filename));
	return new Response(await streamOf(file.bytes()), { headers });
}

/** RFC 6266: an ASCII name for old programs, the true one beside it. */
function disposition(filename: string): string {
	const plain = filename.replace(/[^\x20-\x7e]|["\\%]/g, '_');
	const encoded = encodeURIComponent(filename).replace(
		/['()*]/g,
		(c) => `%${c.charCodeAt(0).toString(16).toUpperCase()}`
	);
	return `attachment; filename="${plain}"; filename*=UTF-8''${encoded}`;
}

async function streamOf(bytes: AsyncIterable<Uint8Array>): Promise<ReadableStream<Uint8Array>> {
	const pieces = bytes[Symbol.asyncIterator]();
	let first: IteratorResult<Uint8Array> | null = await pieces.next();
	return new ReadableStream<Uint8Array>(
		{
			async pull(controller) {
				const { done, value } = first ?? (await pieces.next());
				first = null;
				if (done) controller.close();
				else controller.enqueue(value);
			},
			async cancel() {
				await pieces.return?.();
			}
		},
		{ highWaterMark: 1 }
	);
}

/** The bytes of an upload and how many were announced. */
export function uploadOf(event: RequestEvent): { body: AsyncIterable<Uint8Array> | null; announced: number | null } {
	const { headers, body } = event.request;
	const length = headers.get('content-length');
	const announced = length === null ? null : Number(length);
	if (body) return { body: unread(body), announced };
	// SvelteKit takes a request without Content-Type for one without a body; programs send files so.
	const raw = (event.platform as { req?: IncomingMessage } | undefined)?.req;
	return { body: raw && !raw.readableEnded ? raw : null, announced };
}

/** The stream piece by piece. Left early, it is not cancelled: that would end the connection before the answer is sent. */
async function* unread(body: ReadableStream<Uint8Array>): AsyncGenerator<Uint8Array> {
	const reader = body.getReader();
	for (;;) {
		const { done, value } = await reader.read();
		if (done) return;
		yield value;
	}
}

/** Does some work with a signal that is aborted when the caller goes away before it is done. */
export async function whileCallerWaits<T>(event: RequestEvent, work: (signal: AbortSignal) => Promise<T>): Promise<T> {
	const gone = new AbortController();
	const onClose = () => gone.abort();
	// request.signal tells only of callers that leave before they have sent everything.
	const socket = (event.platform as { req?: IncomingMessage } | undefined)?.req?.socket;
	socket?.once('close', onClose);
	try {
		return await work(AbortSignal.any([gone.signal, event.request.signal]));
	} finally {
		// The connection serves more calls after this one.
		socket?.off('close', onClose);
	}
}
