/** Computes rehearsal objectives on a shape and stores value and map of each, as if a solver had posted them. */
import { randomUUID } from 'node:crypto';
import { mapTotal, rehearse } from '$lib/morph';
import type { Rehearsal } from '$lib/api/schemas/studies';
import { putContent } from '../../content/store';
import { AppError } from '../../errors';
import { recordEvent } from '../../repositories/audit';
import { findShape, insertMap, insertResult, touchStudy } from '../../repositories/shapes';
import { findStudyRow } from '../../repositories/studies';
import { patchTriangles } from '../../services/lock-weights';
import { MeshCache } from '../../services/mesh-cache';
import { actorOf, storeAndEnd, type JobTask } from './job-task';

interface Payload {
	shapeId: string;
	operatingPointId: string;
	objectives: { id: string; name: string; rehearsal: Rehearsal }[];
}

/** @throws AppError not-found, invalid (a patch that the shape has not); MorphError; Stopped; NotOurs */
export async function rehearseTask(task: JobTask): Promise<void> {
	const { job, control } = task;
	const { shapeId, operatingPointId, objectives } = job.payload as unknown as Payload;
	const shape = await findShape(shapeId);
	if (!shape) throw new AppError('not-found', 'The shape to be rehearsed is not there.');
	const symmetry = (await findStudyRow(job.studyId))?.symmetry ?? null;
	const parent = await new MeshCache(0).shape(shape, symmetry, control.stage('Reading the surface', 0, 0.4));
	const checkpoint = control.stage('Rehearsing', 0.4, 0.8);
	const { surface, mesh } = parent;
	const made = objectives.map(({ id, name, rehearsal }, i) => {
		const { kind, direction, stagnation, patches } = rehearsal;
		const missing = patches?.find((patch) => !mesh.patches.some((has) => has.name === patch));
		if (missing !== undefined) {
			throw new AppError(
				'invalid',
				`${name} is rehearsed on the patch “${missing}”, which shape ${shape.number} has not.`,
				{
					mend: 'Make the objective again with patches that the shape has.'
				}
			);
		}
		const triangles = patches && patchTriangles(patches, mesh.patches);
		const spec = { kind, direction, stagnation, triangles, symmetry: symmetry ?? undefined };
		const { value, gradient } = rehearse(surface.positions, surface.triangles, spec);
		checkpoint((i + 1) / objectives.length);
		return { id, name, value, gradient };
	});
	const progress = control.stage('Storing the map', 0.8, 1);
	await storeAndEnd(
		task,
		'Value and map are stored',
		async (tx) => {
			const stored: string[] = [];
			for (const { gradient } of made) {
				stored.push((await putContent(gradient, tx)).id);
				progress(stored.length / made.length);
			}
			return stored;
		},
		async (tx, valuesIds) => {
			const ended: { objectiveId: string; value: number; mapId: string; resultId: string }[] = [];
			for (const [i, { id: objectiveId, name, value, gradient }] of made.entries()) {
				const mapId = randomUUID();
				const common = { shapeId, objectiveId, operatingPointId, rehearsal: true, createdBy: job.createdBy };
				const count = gradient.length / 3;
				await insertMap(
					{
						...common,
						id: mapId,
						filename: `rehearsal of ${name}`,
						kind: 'vector',
						location: 'vertex',
						outward: 'raises',
						originalId: null,
						valuesId: valuesIds[i],
						report: {
							rows: count,
							matched: count,
							unmatched: 0,
							maxDistance: 0,
							coverage: 1,
							total: mapTotal(gradient, surface)
						}
					},
					tx
				);
				const note = 'Rehearsal: computed from the surface alone, not a flow solution.';
				const result = await insertResult({ ...common, value, uncertainty: null, note }, tx);
				ended.push({ objectiveId, value, mapId, resultId: result.id });
			}
			await touchStudy(job.studyId, tx);
			await recordEvent(tx, actorOf(job), {
				studyId: job.studyId,
				action: 'shape.rehearsed',
				subjectId: shapeId,
				detail: { objectives: ended.map(({ objectiveId, value }) => ({ objectiveId, value })) }
			});
			return { objectives: ended };
		}
	);
}
