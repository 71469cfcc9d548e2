/** The worker's shell: a request in, its answer out, buffers transferred. */
import { DisplayModel } from './display-model';
import type { DisplayReply, DisplayRequest } from './display-protocol';

const model = new DisplayModel();

/** The buffers of every typed array in an answer. */
function buffersOf(value: unknown, found = new Set<ArrayBuffer>()): Set<ArrayBuffer> {
	if (ArrayBuffer.isView(value)) {
		if (value.buffer instanceof ArrayBuffer) found.add(value.buffer);
	} else if (value !== null && typeof value === 'object') {
		for (const part of Object.values(value)) buffersOf(part, found);
	}
	return found;
}

self.onmessage = ({ data }: MessageEvent<DisplayRequest>) => {
	const reply = (message: DisplayReply, transfer: Transferable[] = []) => self.postMessage(message, { transfer });
	try {
		const call = model.calls[data.call] as (input: DisplayRequest['input']) => unknown;
		const output = call(data.input);
		reply({ id: data.id, output }, [...buffersOf(output)]);
	} catch (cause) {
		reply({ id: data.id, error: cause instanceof Error ? cause.message : String(cause) });
	}
};
