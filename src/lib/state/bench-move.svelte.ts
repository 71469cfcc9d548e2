import { api, asProblem, type ApiProblem } from '$lib/api/client';
import type { Box, ConstraintRequest, MoveAnswer, RecipeInput, Shape, Study } from '$lib/api/schemas';
import type { BoxesState } from './bench-boxes.svelte';
import { bodyOf } from './bench-boxes.svelte';

export type VolumeChoice = 'hold' | 'atLeast' | 'atMost' | 'free';
export type ObjectiveChoice = 'free' | 'hold' | 'atLeast' | 'atMost';

export interface Preview {
	shapeId: string;
	/** What the answer is for, to know whether it still holds. */
	key: string;
	boxes: Box[];
	answer: MoveAnswer;
}

const PREVIEW_AFTER_MS = 350;

/** The next move: its recipe as people set it, and what the last preview said. Lengths in metres. */
export class MoveState {
	boxIds = $state.raw<string[]>([]);
	step = $state(0.004);
	smoothing = $state(0.025);
	volume = $state<VolumeChoice>('hold');
	objectives = $state.raw<Record<string, { choice: ObjectiveChoice; value: number | null }>>({});
	/** Only those that differ from the study's. */
	weights = $state.raw<Record<string, number>>({});
	/** Preview by itself when something changes. */
	live = $state(true);
	preview = $state.raw<Preview | null>(null);
	working = $state(false);
	problem = $state.raw<ApiProblem | null>(null);
	#abort: AbortController | null = null;
	#timer: ReturnType<typeof setTimeout> | undefined;

	constructor(
		readonly study: () => Study | null,
		readonly shape: () => Shape | null,
		readonly boxes: BoxesState,
		readonly previewed: (preview: Preview) => void
	) {}

	readonly used = $derived.by(() => this.boxes.list.filter((b) => this.boxIds.includes(b.id)));

	weightOf(objectiveId: string): number {
		return this.weights[objectiveId] ?? this.study()?.objectives.find((o) => o.id === objectiveId)?.weight ?? 0;
	}

	readonly recipe = $derived.by((): RecipeInput => {
		const constraints: ConstraintRequest[] = [];
		if (this.volume !== 'free' && this.shape()?.closed) constraints.push({ kind: 'volume', bound: this.volume });
		for (const [objectiveId, { choice, value }] of Object.entries(this.objectives)) {
			if (choice === 'free') continue;
			constraints.push({ kind: 'objective', objectiveId, bound: choice, ...(value === null ? {} : { value }) });
		}
		return {
			boxIds: this.used.map((b) => b.id),
			mode: 'lattice',
			step: this.step,
			smoothing: this.smoothing,
			...(Object.keys(this.weights).length ? { weights: this.weights } : {}),
			constraints
		};
	});

	readonly #key = $derived.by(() => JSON.stringify([this.shape()?.id, this.recipe, this.used.map(bodyOf)]));

	/** Why there can be no preview, in words; null when there can. */
	readonly obstacle = $derived.by((): { text: string; mend: 'map' | 'box' | 'weight' } | null => {
		const shape = this.shape();
		const study = this.study();
		if (!shape || !study) return null;
		if (shape.maps.length === 0) {
			return {
				text: 'This shape has no sensitivity map yet, so there is nothing to say where moving it helps.',
				mend: 'map'
			};
		}
		if (this.used.length === 0) return { text: 'No design box is taken into the move: nothing may move.', mend: 'box' };
		const steers = shape.maps.some((m) => {
			const objective = study.objectives.find((o) => o.id === m.objectiveId);
			return objective && objective.sense !== 'hold' && this.weightOf(objective.id) > 0;
		});
		if (!steers)
			return { text: 'No objective with a map on this shape has a weight: nothing steers the move.', mend: 'weight' };
		return null;
	});

	readonly stale = $derived(this.preview !== null && this.preview.key !== this.#key);
	/** The answer of the last preview of this shape, stale or not. */
	readonly answer = $derived.by(() =>
		this.preview?.shapeId === this.shape()?.id ? (this.preview?.answer ?? null) : null
	);
	readonly brokenHard = $derived(
		Object.entries(this.answer?.checks ?? {}).filter(([, check]) => check.hard && !check.ok)
	);

	/** To be read by an effect: changes whenever another preview is due. Not while a handle is held: the server has the old box. */
	get due(): string | null {
		return this.boxes.dragging ? null : this.#key;
	}

	schedule() {
		clearTimeout(this.#timer);
		this.#abort?.abort();
		this.working = false;
		if (this.live && this.due !== null && !this.obstacle && this.shape() && (this.stale || !this.answer)) {
			this.#timer = setTimeout(() => void this.ask(), PREVIEW_AFTER_MS);
		}
	}

	/** Previews now. A preview on its way is dropped. */
	async ask() {
		const shape = this.shape();
		if (!shape || this.obstacle || this.boxes.dragging) return;
		clearTimeout(this.#timer);
		this.#abort?.abort();
		const abort = (this.#abort = new AbortController());
		this.working = true;
		this.problem = null;
		try {
			// The server moves the boxes that it has: what is shown must be what is stored, also after edits made meanwhile.
			let key: string;
			do {
				key = this.#key;
				await this.boxes.flush();
			} while (key !== this.#key);
			const [boxes, body] = [this.used, this.recipe];
			if (abort.signal.aborted) return;
			const answer = await api.previewMove({ id: shape.id, body, signal: abort.signal });
			if (abort.signal.aborted) return;
			this.preview = { shapeId: shape.id, key, boxes, answer };
			this.previewed(this.preview);
		} catch (cause) {
			if (!abort.signal.aborted) this.problem = asProblem(cause);
		} finally {
			if (this.#abort === abort) this.working = false;
		}
	}

	cancel() {
		clearTimeout(this.#timer);
		this.#abort?.abort();
		this.#abort = null;
		this.working = false;
	}

	use(id: string, on: boolean) {
		const others = this.boxIds.filter((b) => b !== id);
		this.boxIds = on ? [...others, id] : others;
	}

	weigh(objectiveId: string, weight: number) {
		this.weights = { ...this.weights, [objectiveId]: weight };
	}

	bound(objectiveId: string, choice: ObjectiveChoice, value: number | null = null) {
		this.objectives = { ...this.objectives, [objectiveId]: { choice, value } };
	}
}
