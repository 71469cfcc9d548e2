/** Keep-outs: where the surface must not go, or must stay. */
import type { z } from 'zod';
import type { KeepOut, KeepOutDefinition, keepOutImportQuery, keepOutReplace } from '$lib/api/schemas/drawn';
import type { Actor, StudyAccess } from '../auth/caller';
import type { Upload } from '../content/upload';
import { AppError } from '../errors';
import { keepOuts, type DrawnRow, type MeshContents } from '../repositories/drawn';
import { inTransaction } from '../repositories/transaction';
import { DrawnService } from './drawn';
import { queueJob } from './jobs';

export function keepOutAnswer(row: DrawnRow<KeepOutDefinition>): KeepOut {
	const { name, geometry, side, clearance } = row.definition;
	return {
		id: row.id,
		studyId: row.studyId,
		version: row.version,
		name,
		geometry,
		side,
		clearance,
		updatedAt: row.updatedAt.toISOString()
	};
}

export const keepOutService = new DrawnService<KeepOutDefinition, MeshContents, KeepOut>(
	keepOuts,
	'keep-out',
	'keep-out',
	keepOutAnswer
);

/**
 * An uploaded surface stays what it is: an edit changes its name, side and clearance.
 *
 * @throws AppError invalid, conflict
 */
export function replaceKeepOut(
	access: StudyAccess,
	id: string,
	{ version, ...body }: z.output<typeof keepOutReplace>
): Promise<KeepOut> {
	const definition = { ...body } as KeepOutDefinition;
	const check = (row: DrawnRow<KeepOutDefinition>) => {
		const { geometry } = row.definition;
		if ((geometry.kind === 'mesh') === (body.geometry === undefined)) {
			if (geometry.kind === 'mesh') definition.geometry = geometry;
			return;
		}
		const detail =
			geometry.kind === 'mesh'
				? 'The geometry of an uploaded keep-out stays what it is.'
				: 'A keep-out that is no uploaded surface needs its geometry.';
		throw new AppError('invalid', detail, {
			errors: [{ pointer: '/geometry', detail }],
			mend: geometry.kind === 'mesh' ? 'Leave geometry out, or upload a new keep-out.' : 'Give its plane or box.'
		});
	};
	return keepOutService.replace(access, id, definition, { basedOn: version, check });
}

/** Stores the upload and queues its import. @returns the job's id; its result is {keepOutId} */
export function importKeepOut(
	studyId: string,
	query: z.output<typeof keepOutImportQuery>,
	upload: Upload,
	actor: Actor
): Promise<string> {
	return inTransaction(async (tx) => {
		const { id: uploadId } = await upload.store(tx);
		return queueJob({ kind: 'import-keep-out', studyId, actor, payload: { uploadId, ...query } }, tx);
	});
}

/** The contents of an uploaded keep-out. @throws AppError not-found */
export async function keepOutContents(id: string): Promise<{ positionsId: string; trianglesId: string }> {
	const row = await keepOuts.find(id);
	if (!row?.positionsId || !row.trianglesId) {
		throw new AppError('not-found', 'There is no such keep-out, or it is no uploaded surface.');
	}
	return { positionsId: row.positionsId, trianglesId: row.trianglesId };
}
