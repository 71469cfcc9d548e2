/** Does one task in a worker thread, whatever comes of it. The thread's entry is a shell over this. */
import { database } from '../db/client';
import { AppError, asAppError } from '../errors';
import { type MeshCache } from '../services/mesh-cache';
import { Control, Stopped } from './control';
import type { ThreadOutcome, ThreadTask } from './protocol';
import { fileTask } from './tasks/file';
import { importKeepOutTask } from './tasks/import-keep-out';
import { importMapTask } from './tasks/import-map';
import { importShapeTask } from './tasks/import-shape';
import { NotOurs, type JobTask } from './tasks/job-task';
import { commitTask, previewTask } from './tasks/move';
import { rehearseTask } from './tasks/rehearse';
import type { ClaimedJob } from '../repositories/jobs';

/** Bytes of surfaces, gradients and prepared moves that a previewing thread keeps: some ten surfaces of half a million vertices. */
export const PREVIEW_CACHE_BYTES = 800_000_000;

const JOBS: Record<ClaimedJob['kind'], (task: JobTask) => Promise<void>> = {
	'import-shape': importShapeTask,
	'import-map': importMapTask,
	'import-keep-out': importKeepOutTask,
	rehearse: rehearseTask,
	move: commitTask
};

/** @param cache kept by the thread from preview to preview */
export async function runTask(task: ThreadTask, cache: MeshCache): Promise<ThreadOutcome> {
	const control = new Control(task.control);
	// Binds the models, also in a thread whose first query goes through one.
	database();
	try {
		// It may have waited for this thread longer than for its caller.
		control.check();
		switch (task.kind) {
			case 'job':
				await JOBS[task.job.kind]({ job: task.job, control });
				return { outcome: 'done' };
			case 'preview':
				return { outcome: 'answer', answer: await previewTask(task.shapeId, task.request, cache, control) };
			case 'file':
				await fileTask(task.file, task.port, control);
				return { outcome: 'done' };
			case 'warm':
				return { outcome: 'done' };
		}
	} catch (error) {
		if (error instanceof Stopped) return { outcome: 'stopped', reason: error.reason };
		if (error instanceof NotOurs) return { outcome: 'lost' };
		return refused(named(error, task));
	}
}

/** A refused file is named by its uploader's name for it. */
function named(error: unknown, task: ThreadTask): AppError {
	const app = asAppError(error);
	if (app.code !== 'bad-file' || task.kind !== 'job') return app;
	const filename = String(task.job.payload.filename);
	if (app.message.includes(filename)) return app;
	return new AppError(app.code, `${filename}: ${app.message}`, { mend: app.mend, errors: app.errors, cause: error });
}

function refused({ code, message, mend, errors, retryAfter }: AppError): ThreadOutcome {
	return { outcome: 'refused', refusal: { code, detail: message, options: { mend, errors, retryAfter } } };
}
