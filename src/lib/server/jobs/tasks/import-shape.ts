/** Reads an uploaded surface, in any of the formats, and stores it as a shape of its study. */
import { randomUUID } from 'node:crypto';
import { readSurface } from '$lib/formats/read';
import type { SurfaceFile } from '$lib/formats/types';
import { surfaceMeasures, toMetres, type SurfaceMeasures } from '$lib/morph';
import { POSITION_CHUNK_BYTES, putContent, readWhole } from '../../content/store';
import { recordEvent } from '../../repositories/audit';
import { insertShape, insertTopology, takeShapeNumber } from '../../repositories/shapes';
import { metresPerUnit } from '../../services/mesh-cache';
import { actorOf, storeAndEnd, type JobTask } from './job-task';

interface Payload {
	uploadId: string;
	filename: string;
	name?: string;
}

/** @throws MorphError of the file; Stopped; NotOurs */
export async function importShapeTask(task: JobTask): Promise<void> {
	const { job, control } = task;
	const { uploadId, filename, name } = job.payload as unknown as Payload;
	const metres = await metresPerUnit(job.studyId);
	control.stage('Reading the file', 0, 0.1);
	const mesh = await readSurface(await readWhole(uploadId), filename, {
		checkpoint: control.stage('Reading the file', 0.1, 0.5)
	});
	const checkpoint = control.stage('Measuring the surface', 0.5, 0.7);
	const measures = surfaceMeasures(toMetres(mesh.positions, metres), mesh.triangles, { checkpoint });
	const progress = control.stage('Storing the shape', 0.7, 1);
	await storeAndEnd(
		task,
		'The shape is stored',
		async (tx) => {
			const positions = await putContent(mesh.positions, tx, { chunkBytes: POSITION_CHUNK_BYTES });
			progress(0.3);
			const triangles = await putContent(mesh.triangles, tx);
			progress(0.9);
			const attributes = mesh.attributes && (await putContent(mesh.attributes, tx));
			return { positionsId: positions.id, trianglesId: triangles.id, attributesId: attributes?.id ?? null };
		},
		async (tx, { positionsId, trianglesId, attributesId }) => {
			const topologyId = randomUUID();
			const shapeId = randomUUID();
			await insertTopology(topologyRow(topologyId, job.studyId, mesh, measures, { trianglesId, attributesId }), tx);
			const number = await takeShapeNumber(job.studyId, tx);
			await insertShape(
				{
					id: shapeId,
					studyId: job.studyId,
					number,
					parentId: null,
					name: name ?? (number === 0 ? 'Baseline' : filename.replace(/(\.(stl|obj|ply|vtk|vtp))?(\.(gz|zip))?$/i, '')),
					topologyId,
					positionsId,
					originalId: uploadId,
					filename,
					measures: measuresOf(measures),
					createdBy: job.createdBy
				},
				tx
			);
			const detail = { number, filename, triangles: measures.triangleCount };
			await recordEvent(tx, actorOf(job), {
				studyId: job.studyId,
				action: 'shape.imported',
				subjectId: shapeId,
				detail
			});
			return { shapeId };
		}
	);
}

function topologyRow(
	id: string,
	studyId: string,
	mesh: SurfaceFile,
	measures: SurfaceMeasures,
	contents: { trianglesId: string; attributesId: string | null }
) {
	const { boundaryEdges, nonManifoldEdges, inconsistentEdges, degenerateTriangles } = measures;
	return {
		id,
		studyId,
		vertexCount: measures.vertexCount,
		triangleCount: measures.triangleCount,
		...contents,
		patches: mesh.patches,
		// How the STL goes out unless it is asked for otherwise: as text where text came in.
		encoding: mesh.encoding === 'ascii' ? ('ascii' as const) : ('binary' as const),
		health: { boundaryEdges, nonManifoldEdges, inconsistentEdges, degenerateTriangles }
	};
}

/** What is kept of a shape's measures; an open surface has no volume. */
export function measuresOf({ area, closed, volume, bounds }: SurfaceMeasures) {
	return { area, closed, volume: closed ? volume : null, bounds };
}
