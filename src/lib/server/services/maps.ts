/** Sensitivity maps: uploading one, and its values for display. */
import type { z } from 'zod';
import type { mapImportQuery } from '$lib/api/schemas/maps';
import type { Actor } from '../auth/caller';
import type { Upload } from '../content/upload';
import { inTransaction } from '../repositories/transaction';
import { queueJob } from './jobs';
import { requireObjectiveAt, requireShape } from './shapes';

/** What an upload of a map is checked for before its bytes are read. */
export async function checkMapImport(shapeId: string, query: z.output<typeof mapImportQuery>) {
	const { studyId } = await requireShape(shapeId);
	const { objectiveId, operatingPointId } = await requireObjectiveAt(studyId, query);
	const { filename, kind, location, outward } = query;
	return { studyId, payload: { shapeId, objectiveId, operatingPointId, filename, kind, location, outward } };
}

/**
 * Stores the upload and queues its import.
 *
 * @param checked what checkMapImport returned
 * @returns the job's id; its result is {mapId, matched, unmatched, maxDistance, total, ...}
 */
export function importMap(
	{ studyId, payload }: Awaited<ReturnType<typeof checkMapImport>>,
	upload: Upload,
	actor: Actor
): Promise<string> {
	return inTransaction(async (tx) => {
		const { id: uploadId } = await upload.store(tx);
		return queueJob({ kind: 'import-map', studyId, actor, payload: { uploadId, ...payload } }, tx);
	});
}
