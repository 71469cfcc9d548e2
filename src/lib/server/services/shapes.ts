/** Shapes of a study: uploading one, looking at them, and what the solver found for one. */
import type { z } from 'zod';
import type { Result, resultCreate } from '$lib/api/schemas/maps';
import type { Shape, shapeImportQuery, ShapeSummary } from '$lib/api/schemas/shapes';
import type { Actor } from '../auth/caller';
import type { Upload } from '../content/upload';
import { AppError } from '../errors';
import { recordEvent } from '../repositories/audit';
import { listObjectives, listOperatingPoints } from '../repositories/studies';
import * as shapes from '../repositories/shapes';
import { inTransaction } from '../repositories/transaction';
import { queueJob } from './jobs';
import { resultView, shapeView, summaryView } from './shape-view';

/**
 * Stores the upload and queues its import.
 *
 * @returns the job's id; its result is {shapeId}
 */
export function importShape(
	studyId: string,
	query: z.output<typeof shapeImportQuery>,
	upload: Upload,
	actor: Actor
): Promise<string> {
	return inTransaction(async (tx) => {
		const { id: uploadId } = await upload.store(tx);
		return queueJob({ kind: 'import-shape', studyId, actor, payload: { uploadId, ...query } }, tx);
	});
}

export async function listShapes(studyId: string): Promise<ShapeSummary[]> {
	const [rows, objectives, mapCounts] = await Promise.all([
		shapes.findShapes(studyId),
		listObjectives(studyId),
		shapes.countMaps(studyId)
	]);
	const results = await shapes.findLatestResults(rows.map((row) => row.id));
	const objectiveIds = objectives.map((objective) => objective.id);
	return rows.map((row) =>
		summaryView(row, {
			objectiveIds,
			results: results.filter((result) => result.shapeId === row.id),
			mapCount: mapCounts.get(row.id) ?? 0
		})
	);
}

/** @throws AppError not-found */
export async function getShape(id: string): Promise<Shape> {
	const row = await requireShape(id);
	const [objectives, results, maps] = await Promise.all([
		listObjectives(row.studyId),
		shapes.findLatestResults([id]),
		shapes.findLatestMaps([id])
	]);
	return shapeView(row, { objectiveIds: objectives.map((objective) => objective.id), results, maps });
}

/** @throws AppError not-found */
export async function requireShape(id: string) {
	const row = await shapes.findShape(id);
	if (!row) throw new AppError('not-found', 'There is no such shape.');
	return row;
}

/**
 * The objective and the operating point (default: the study's first) that a map or a result names, checked to be the study's.
 *
 * @throws AppError invalid with a pointer to the field
 */
export async function requireObjectiveAt(
	studyId: string,
	{ objectiveId, operatingPointId }: { objectiveId: string; operatingPointId?: string }
): Promise<{ objectiveId: string; operatingPointId: string; objectiveName: string }> {
	const [objectives, points] = await Promise.all([listObjectives(studyId), listOperatingPoints(studyId)]);
	const objective = objectives.find((row) => row.id === objectiveId);
	if (!objective) {
		throw new AppError('invalid', 'The study has no such objective.', {
			errors: [{ pointer: '/objectiveId', detail: 'no objective of this study' }],
			mend: 'Take an objectiveId that GET /api/studies/{id} lists.'
		});
	}
	const point = operatingPointId ? points.find((row) => row.id === operatingPointId) : points[0];
	if (!point) {
		throw new AppError(
			'invalid',
			operatingPointId ? 'The study has no such operating point.' : 'The study has no operating point.',
			{
				errors: [{ pointer: '/operatingPointId', detail: 'no operating point of this study' }],
				mend: operatingPointId
					? 'Take one that GET /api/studies/{id} lists.'
					: 'Add an operating point to the study first.'
			}
		);
	}
	return { objectiveId, operatingPointId: point.id, objectiveName: objective.name };
}

/**
 * Enters what the solver found. Earlier results stay; the latest counts.
 *
 * @throws AppError not-found, invalid
 */
export async function createResult(
	shapeId: string,
	body: z.output<typeof resultCreate>,
	actor: Actor
): Promise<Result> {
	const { studyId } = await requireShape(shapeId);
	const { objectiveId, operatingPointId } = await requireObjectiveAt(studyId, body);
	return inTransaction(async (tx) => {
		const row = await shapes.insertResult(
			{
				shapeId,
				objectiveId,
				operatingPointId,
				value: body.value,
				uncertainty: body.uncertainty ?? null,
				note: body.note ?? '',
				createdBy: actor.userId
			},
			tx
		);
		await shapes.touchStudy(studyId, tx);
		await recordEvent(tx, actor, {
			studyId,
			action: 'result.entered',
			subjectId: row.id,
			detail: { shapeId, objectiveId, operatingPointId, value: body.value }
		});
		return resultView(row);
	});
}
