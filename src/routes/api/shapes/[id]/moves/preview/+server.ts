import { operations } from '$lib/api/contract';
import { whileCallerWaits } from '$lib/server/http/files';
import { handle } from '$lib/server/http/handle';
import { previewMove } from '$lib/server/services/moves';

export const POST = handle(operations.previewMove, ({ params, body, event }) =>
	whileCallerWaits(event, (signal) => previewMove(params.id, body, signal))
);
