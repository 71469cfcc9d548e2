/** Rehearsal objectives: computed from the surface alone, in place of a solver. */
import type { z } from 'zod';
import type { rehearsalRequest } from '$lib/api/schemas/maps';
import type { Actor } from '../auth/caller';
import { AppError } from '../errors';
import { listObjectives, listOperatingPoints } from '../repositories/studies';
import { inTransaction } from '../repositories/transaction';
import { queueJob } from './jobs';
import { requireShape } from './shapes';

/**
 * Queues the computation of values and maps.
 *
 * @returns the job's id; its result is {objectives: [{objectiveId, value, mapId, resultId}]}
 * @throws AppError not-found, invalid
 */
export async function rehearse(
	shapeId: string,
	{ objectiveIds }: z.output<typeof rehearsalRequest>,
	actor: Actor
): Promise<string> {
	const { studyId } = await requireShape(shapeId);
	const [objectives, [point]] = await Promise.all([listObjectives(studyId), listOperatingPoints(studyId)]);
	const all = objectives.filter(({ rehearsal }) => rehearsal);
	const chosen = objectiveIds ? all.filter(({ id }) => objectiveIds.includes(id)) : all;
	const strange = objectiveIds?.findIndex((id) => !all.some((objective) => objective.id === id)) ?? -1;
	if (chosen.length === 0 || strange >= 0) {
		const detail = strange >= 0 ? 'No rehearsal objective of this study.' : 'The study has no rehearsal objective.';
		throw new AppError('invalid', detail, {
			errors: [{ pointer: strange >= 0 ? `/objectiveIds/${strange}` : '/objectiveIds', detail }],
			mend: 'Add an objective that is rehearsed to the study.'
		});
	}
	const payload = {
		shapeId,
		operatingPointId: point.id,
		objectives: chosen.map(({ id, name, rehearsal }) => ({ id, name, rehearsal }))
	};
	return inTransaction((tx) => queueJob({ kind: 'rehearse', studyId, actor, payload }, tx));
}
