/** Moves: previewed in a worker thread while the caller waits, committed by a job. */
import type { z } from 'zod';
import type { moveRequest, MoveAnswer, RecipeRequest } from '$lib/api/schemas/moves';
import type { Actor } from '../auth/caller';
import { AppError } from '../errors';
import { Control } from '../jobs/control';
import { jobsRuntime } from '../jobs/runtime';
import { inTransaction } from '../repositories/transaction';
import { queueJob } from './jobs';
import { completeRecipe } from './recipe';
import { requireShape } from './shapes';

/**
 * What a move would do. Nothing is stored.
 *
 * @param signal aborting it stops the work
 * @throws AppError
 */
export async function previewMove(shapeId: string, request: RecipeRequest, signal?: AbortSignal): Promise<MoveAnswer> {
	const control = new Control();
	const stop = () => control.stop('cancelled');
	if (signal?.aborted) stop();
	signal?.addEventListener('abort', stop);
	try {
		const outcome = await jobsRuntime().previews.run({ kind: 'preview', shapeId, request, control: control.buffer });
		if (outcome.outcome === 'answer') return outcome.answer;
		if (outcome.outcome === 'refused') {
			const { code, detail, options } = outcome.refusal;
			throw new AppError(code, detail, options);
		}
		throw new AppError('cancelled', 'The preview was cancelled.');
	} finally {
		signal?.removeEventListener('abort', stop);
	}
}

/**
 * Freezes the complete recipe as it is now and queues the move.
 *
 * @returns the job's id; its result is the new shape's id and what the preview answers
 * @throws AppError for what is wrong with the request itself; the job fails with what the engine refuses
 */
export async function commitMove(
	shapeId: string,
	{ name, note, ...request }: z.output<typeof moveRequest>,
	actor: Actor
): Promise<string> {
	const shape = await requireShape(shapeId);
	const complete = await completeRecipe(shape, request);
	return inTransaction((tx) =>
		queueJob({ kind: 'move', studyId: shape.studyId, actor, payload: { shapeId, name, note, ...complete } }, tx)
	);
}
