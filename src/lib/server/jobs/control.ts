/** What a worker thread and the process that started it tell each other while the thread is busy: one shared buffer. */

/** What a job is doing, in the words that the page shows. The buffer carries the index. */
export const STAGES = [
	'Starting',
	'Reading the file',
	'Measuring the surface',
	'Storing the shape',
	'Reading the surface',
	'Reading the map',
	'Matching the map to the surface',
	'Storing the map',
	'Storing the keep-out',
	'Rehearsing',
	'Preparing the move',
	'Solving for the move',
	'Checking the moved surface',
	'Storing the moved shape',
	'Writing the file'
] as const;
export type Stage = (typeof STAGES)[number];

/** Why a thread is to stop. */
export type StopReason = 'cancelled' | 'shutdown';
const REASONS: StopReason[] = ['cancelled', 'shutdown'];

/** Int32: why to stop (0: go on, else the reason's index plus 1). */
const STOP = 0;
/** Int32: index of the stage. */
const STAGE = 1;
/** Byte offset of the progress, a float64 in 0..1. */
const PROGRESS_OFFSET = 8;
const BYTES = 16;

/** Thrown in the thread at the next checkpoint after it was told to stop. */
export class Stopped extends Error {
	override readonly name = 'Stopped';
	constructor(readonly reason: StopReason) {
		super(`Stopped: ${reason}.`);
	}
}

/** Both ends of the shared buffer. */
export class Control {
	readonly #ints: Int32Array;
	readonly #progress: Float64Array;

	constructor(readonly buffer: SharedArrayBuffer = new SharedArrayBuffer(BYTES)) {
		this.#ints = new Int32Array(buffer, 0, 2);
		this.#progress = new Float64Array(buffer, PROGRESS_OFFSET, 1);
	}

	/** Tells the thread to stop at its next checkpoint; the first reason stays. */
	stop(reason: StopReason): void {
		Atomics.compareExchange(this.#ints, STOP, 0, REASONS.indexOf(reason) + 1);
	}

	get stopped(): StopReason | null {
		return REASONS[Atomics.load(this.#ints, STOP) - 1] ?? null;
	}

	/** @throws Stopped when the thread is to stop */
	check(): void {
		const reason = this.stopped;
		if (reason) throw new Stopped(reason);
	}

	/**
	 * Begins a stage of the work.
	 *
	 * @param from share (0..1) of the whole work that is done when it begins
	 * @param to and when it ends
	 * @returns a checkpoint for the engine: reports the fraction of this stage, and throws Stopped when told to stop
	 */
	stage(stage: Stage, from: number, to: number): (fraction: number) => void {
		this.check();
		Atomics.store(this.#ints, STAGE, STAGES.indexOf(stage));
		this.#progress[0] = from;
		return (fraction) => {
			this.#progress[0] = from + (to - from) * Math.min(1, Math.max(0, fraction));
			this.check();
		};
	}

	get state(): { progress: number; message: Stage } {
		return { progress: this.#progress[0], message: STAGES[Atomics.load(this.#ints, STAGE)] };
	}
}
