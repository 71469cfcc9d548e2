import { ApiProblem, asProblem, problemFromText } from '$lib/api/client';
import { JobCancelled } from './jobs';

/**
 * Sends a file as the request's body, with progress, and answers the id of the job that reads it. XMLHttpRequest, because
 * `fetch` does not report how much of a body has left. Aborting `signal` stops it; the server then keeps nothing.
 */
export function sendFile(
	url: string,
	file: Blob,
	options: { onProgress?: (share: number) => void; signal?: AbortSignal } = {}
): Promise<string> {
	return new Promise((resolve, reject) => {
		const request = new XMLHttpRequest();
		const abort = () => request.abort();
		request.open('POST', url);
		request.setRequestHeader('content-type', 'application/octet-stream');
		request.upload.onprogress = (event) => {
			if (event.lengthComputable) options.onProgress?.(event.total === 0 ? 1 : event.loaded / event.total);
		};
		request.onload = () => {
			if (request.status < 200 || request.status >= 300) {
				reject(problemFromText(request.status, request.statusText, request.responseText));
				return;
			}
			try {
				resolve((JSON.parse(request.responseText) as { jobId: string }).jobId);
			} catch (cause) {
				reject(asProblem(cause));
			}
		};
		request.onerror = () =>
			reject(
				new ApiProblem({
					type: 'about:blank',
					title: 'The upload broke off',
					status: 0,
					code: 'offline',
					detail: 'The connection ended before the whole file had arrived.',
					mend: 'Send the file again. Nothing of it was kept.'
				})
			);
		request.onabort = () => reject(new JobCancelled(null));
		request.onloadend = () => options.signal?.removeEventListener('abort', abort);
		if (options.signal?.aborted) {
			reject(new JobCancelled(null));
			return;
		}
		options.signal?.addEventListener('abort', abort, { once: true });
		request.send(file);
	});
}
