/** Reads an uploaded sensitivity map, brings it onto its shape and stores it. */
import { randomUUID } from 'node:crypto';
import { makeSurface, mapTotal, matchMap, nodalGradient, readMapCsv, toMetres, type MapMatch } from '$lib/morph';
import type { MapImported } from '$lib/api/schemas/jobs';
import type { SensitivityMap } from '$lib/api/schemas/maps';
import type { Shape } from '$lib/api/schemas/shapes';
import { putContent, readWhole } from '../../content/store';
import { AppError } from '../../errors';
import { recordEvent } from '../../repositories/audit';
import { findShape, insertMap, touchStudy } from '../../repositories/shapes';
import { metresPerUnit, readMesh } from '../../services/mesh-cache';
import { actorOf, storeAndEnd, type JobTask } from './job-task';

interface Payload {
	uploadId: string;
	shapeId: string;
	objectiveId: string;
	operatingPointId: string;
	filename: string;
	kind: SensitivityMap['kind'];
	location: SensitivityMap['location'];
	outward: SensitivityMap['outward'];
}

/** A map that leaves more of the surface than this without a value is refused: a move would follow a half-blind gradient. */
const LEAST_COVERAGE = 0.5;

/** @throws MorphError csv-*, map-*; AppError bad-file; Stopped; NotOurs */
export async function importMapTask(task: JobTask): Promise<void> {
	const { job, control } = task;
	const payload = job.payload as unknown as Payload;
	const { uploadId, shapeId, kind, location, outward } = payload;
	const shape = await findShape(shapeId);
	if (!shape) throw new AppError('not-found', 'The shape of this map is not there.');
	control.stage('Reading the surface', 0, 0.1);
	const [mesh, metres, bytes] = await Promise.all([readMesh(shape), metresPerUnit(job.studyId), readWhole(uploadId)]);
	const table = readMapCsv(bytes, { checkpoint: control.stage('Reading the map', 0.1, 0.4) });
	const checkpoint = control.stage('Matching the map to the surface', 0.4, 0.8);
	let match: MapMatch;
	try {
		match = matchMap(table, mesh, { kind, location, checkpoint });
	} catch (error) {
		if ((error as { code?: unknown }).code !== 'map-unmatched') throw error;
		throw unfit(
			payload.filename,
			'None of its points lies on the surface',
			table.points,
			shape.measures.bounds,
			metres
		);
	}
	if (match.coverage < LEAST_COVERAGE) {
		const what = `Only ${percent(match.coverage)} of the surface gets a value from it (${match.unmatched} of ${table.rows} points lie off the surface)`;
		throw unfit(payload.filename, what, table.points, shape.measures.bounds, metres);
	}
	const surface = makeSurface(toMetres(mesh.positions, metres), mesh.triangles);
	const report = {
		rows: table.rows,
		matched: match.matched,
		unmatched: match.unmatched,
		maxDistance: match.maxDistance * metres,
		coverage: match.coverage,
		total: mapTotal(nodalGradient({ kind, location, outward, values: match.values }, surface), surface)
	};
	const progress = control.stage('Storing the map', 0.8, 1);
	await storeAndEnd(
		task,
		'The map is stored',
		async (tx) => {
			const values = await putContent(match.values, tx);
			progress(0.9);
			return values.id;
		},
		async (tx, valuesId): Promise<MapImported> => {
			const mapId = randomUUID();
			const { objectiveId, operatingPointId, filename } = payload;
			const row = { shapeId, objectiveId, operatingPointId, filename, kind, location, outward };
			await insertMap({ id: mapId, ...row, originalId: uploadId, valuesId, report, createdBy: job.createdBy }, tx);
			await touchStudy(job.studyId, tx);
			await recordEvent(tx, actorOf(job), {
				studyId: job.studyId,
				action: 'map.imported',
				subjectId: mapId,
				detail: { shapeId, objectiveId, operatingPointId, filename, matched: match.matched }
			});
			return { mapId, ...report };
		}
	);
}

const percent = (share: number) => `${(100 * share).toFixed(share < 0.1 ? 1 : 0)} %`;

/** Ratios of length units that a map's file and a study may differ by, and what that means. */
const UNIT_RATIOS: [number, string][] = [
	[1000, 'a thousand times as large as the surface: its coordinates seem to be in mm, the study’s files in m'],
	[0.001, 'a thousandth of the surface: its coordinates seem to be in m, the study’s files in mm'],
	[100, 'a hundred times as large as the surface: its coordinates seem to be in cm, the study’s files in m'],
	[0.01, 'a hundredth of the surface: its coordinates seem to be in m, the study’s files in cm'],
	[10, 'ten times as large as the surface: its coordinates seem to be in mm, the study’s files in cm'],
	[0.1, 'a tenth of the surface: its coordinates seem to be in cm, the study’s files in mm'],
	[25.4, '25.4 times as large as the surface: its coordinates seem to be in mm, the study’s files in inches'],
	[1 / 25.4, 'a 25.4th of the surface: its coordinates seem to be in inches, the study’s files in mm'],
	[0.0254, 'about a fortieth of the surface: its coordinates seem to be in m, the study’s files in inches'],
	[
		1 / 0.0254,
		'about forty times as large as the surface: its coordinates seem to be in inches, the study’s files in m'
	]
];

/** A refusal with the likely cause: another length unit, or another shape. */
function unfit(
	filename: string,
	what: string,
	points: Float64Array,
	bounds: Shape['bounds'],
	metres: number
): AppError {
	const ratio = extentOf(points) / (extentOfBounds(bounds) / metres);
	const unit = UNIT_RATIOS.find(([factor]) => Math.abs(ratio / factor - 1) < 0.05);
	const mend = unit
		? `The file’s extent is ${unit[1]}. Scale x, y and z to the study’s length unit and upload it again.`
		: 'Check that the map was computed on this very shape, and that it has the study’s frame of coordinates and length unit.';
	return new AppError('bad-file', `${filename} does not fit the shape. ${what}.`, { mend });
}

/** Largest side of the points' bounding box. */
function extentOf(points: Float64Array): number {
	const min = [Infinity, Infinity, Infinity];
	const max = [-Infinity, -Infinity, -Infinity];
	for (let i = 0; i < points.length; i++) {
		min[i % 3] = Math.min(min[i % 3], points[i]);
		max[i % 3] = Math.max(max[i % 3], points[i]);
	}
	return Math.max(...max.map((high, d) => high - min[d]));
}

const extentOfBounds = ({ min, max }: Shape['bounds']) => Math.max(...max.map((high, d) => high - min[d]));
