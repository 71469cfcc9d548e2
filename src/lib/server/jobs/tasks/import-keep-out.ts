/** Reads an uploaded surface and stores it as a keep-out of its study. */
import { readSurface } from '$lib/formats/read';
import { surfaceMeasures, toMetres } from '$lib/morph';
import type { KeepOutDefinition, keepOutImportQuery } from '$lib/api/schemas/drawn';
import type { z } from 'zod';
import { putContent, readWhole } from '../../content/store';
import { AppError } from '../../errors';
import { recordEvent } from '../../repositories/audit';
import { keepOuts } from '../../repositories/drawn';
import { metresPerUnit } from '../../services/mesh-cache';
import { actorOf, storeAndEnd, type JobTask } from './job-task';

type Payload = { uploadId: string } & z.output<typeof keepOutImportQuery>;

/** @throws MorphError of the file; AppError bad-file for an open surface; Stopped; NotOurs */
export async function importKeepOutTask(task: JobTask): Promise<void> {
	const { job, control } = task;
	const { uploadId, filename, name, side, clearance } = job.payload as unknown as Payload;
	const metres = await metresPerUnit(job.studyId);
	control.stage('Reading the file', 0, 0.1);
	const checkpoint = control.stage('Reading the file', 0.1, 0.6);
	const { positions, triangles } = await readSurface(await readWhole(uploadId), filename, { checkpoint });
	const measures = surfaceMeasures(toMetres(positions, metres), triangles, {
		checkpoint: control.stage('Measuring the surface', 0.6, 0.8)
	});
	if (!measures.closed || !(measures.volume > 0)) {
		const { boundaryEdges, nonManifoldEdges, inconsistentEdges } = measures;
		throw new AppError(
			'bad-file',
			measures.closed
				? `${filename}: the surface is turned inside out, so its inside is not told from its outside.`
				: `${filename}: a keep-out must be a closed surface; this one has ${boundaryEdges} open edges, ` +
						`${nonManifoldEdges} edges of more than two triangles and ${inconsistentEdges} between triangles of opposite orientation.`,
			{
				mend: measures.closed
					? 'Turn its triangles round and upload it again.'
					: 'Close it and upload it again, or use a box.'
			}
		);
	}
	const progress = control.stage('Storing the keep-out', 0.8, 1);
	await storeAndEnd(
		task,
		'The keep-out is stored',
		async (tx) => {
			const stored = await putContent(positions, tx);
			progress(0.5);
			return { positionsId: stored.id, trianglesId: (await putContent(triangles, tx)).id };
		},
		async (tx, contents) => {
			const ownerId = await keepOuts.insert({ studyId: job.studyId, ...contents, originalId: uploadId }, tx);
			const definition: KeepOutDefinition = {
				name: name ?? filename.replace(/\.[^.]*$/, ''),
				side,
				clearance,
				geometry: {
					kind: 'mesh',
					filename,
					vertexCount: measures.vertexCount,
					triangleCount: measures.triangleCount,
					bounds: measures.bounds
				}
			};
			await keepOuts.insertVersion({ ownerId, version: 1, definition, createdBy: job.createdBy }, tx);
			await recordEvent(tx, actorOf(job), {
				studyId: job.studyId,
				action: 'keep-out.imported',
				subjectId: ownerId,
				detail: { name: definition.name, filename, triangles: measures.triangleCount }
			});
			return { keepOutId: ownerId };
		}
	);
}
