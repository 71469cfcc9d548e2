/** Jobs and their results on the wire. */
import { z } from 'zod';
import { id, timestamp, problem } from './common';
import { mapReport } from './maps';
import { moveAnswer } from './moves';
import { finite } from './primitives';

export const jobKind = z.enum(['import-shape', 'import-map', 'import-keep-out', 'rehearse', 'move']);
export const jobState = z.enum(['queued', 'running', 'done', 'failed', 'cancelled']);
export const jobAccepted = z.object({ jobId: id });

export const job = z.object({
	id,
	kind: jobKind,
	studyId: id,
	state: jobState,
	progress: finite.min(0).max(1),
	message: z.string(),
	result: z.record(z.string(), z.unknown()).optional(),
	error: problem.optional(),
	createdAt: timestamp
});
export type Job = z.infer<typeof job>;

export const shapeImported = z.object({ shapeId: id });

export const mapImported = mapReport.extend({ mapId: id });
export type MapImported = z.infer<typeof mapImported>;

export const moveCommitted = moveAnswer.extend({ shapeId: id, moveId: id });
export type MoveCommitted = z.infer<typeof moveCommitted>;
