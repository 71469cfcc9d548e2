/** What is sent to a worker thread, and what comes back. Everything else is read from and written to the database by the thread. */
import type { MessagePort } from 'node:worker_threads';
import type { MoveAnswer, RecipeRequest } from '$lib/api/schemas/moves';
import type { AppErrorOptions, ErrorCode } from '../errors';
import type { ClaimedJob } from '../repositories/jobs';
import type { StopReason } from './control';

/** An AppError as it crosses between threads. */
export interface Refusal {
	code: ErrorCode;
	detail: string;
	options: Pick<AppErrorOptions, 'mend' | 'errors' | 'retryAfter'>;
}

export type FileRequest =
	| { format: 'stl'; shapeId: string; encoding: 'binary' | 'ascii' }
	| { format: 'obj' | 'ply' | 'vtp'; shapeId: string }
	| { format: 'handover'; shapeId: string; stlName: string }
	/** A map as a density at vertices, float32 little-endian. */
	| { format: 'density'; mapId: string };

export type ThreadTask =
	| { kind: 'job'; job: ClaimedJob; control: SharedArrayBuffer }
	| { kind: 'preview'; shapeId: string; request: RecipeRequest; control: SharedArrayBuffer }
	/** Pieces of the file go through the port, each asked for by a message; null ends them. */
	| { kind: 'file'; file: FileRequest; port: MessagePort; control: SharedArrayBuffer }
	/** Nothing: the thread is there when it has done it. */
	| { kind: 'warm'; control: SharedArrayBuffer };

export type ThreadOutcome =
	/** The job's row says what came of it. */
	| { outcome: 'done' }
	| { outcome: 'answer'; answer: MoveAnswer }
	| { outcome: 'refused'; refusal: Refusal }
	| { outcome: 'stopped'; reason: StopReason }
	/** Another worker has the job: nothing was written. */
	| { outcome: 'lost' };
