import { api, asProblem, type ApiProblem } from '$lib/api/client';
import type { Box } from '$lib/api/schemas/drawn';
import type { ConstraintRequest, MoveAnswer, RecipeInput } from '$lib/api/schemas/moves';
import type { Shape } from '$lib/api/schemas/shapes';
import type { Study } from '$lib/api/schemas/studies';
import type { BoxesState } from './bench-boxes.svelte';
import { bodyOf } from './bench-boxes.svelte';
import { HandState } from './bench-hand.svelte';
import type { KeepingState } from './bench-keeping.svelte';

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
	mode = $state<'lattice' | 'surface'>('lattice');
	/** How far inward and outward a vertex may go, metres; null: as far as it will. */
	inward = $state<number | null>(null);
	outward = $state<number | null>(null);
	/** The box in which those two hold; null: everywhere. */
	boundedIn = $state<string | null>(null);
	/** Least wall thickness, metres; null: any. */
	thickness = $state<number | null>(null);
	/** Smallest radius of curvature where the surface moves, metres; null: not checked. */
	radius = $state<number | null>(null);
	/** Keep the study's symmetry plane, where it has one. */
	symmetric = $state(true);
	/** Control points moved by hand. */
	readonly hand = new HandState();
	/** Keep-outs and locks that this move does without. */
	leftOut = $state.raw<string[]>([]);
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
		readonly keeping: KeepingState,
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
		const { inward, outward } = this;
		if (this.mode === 'lattice') {
			for (const { id } of this.keeping.keepOuts)
				if (this.keeps(id)) constraints.push({ kind: 'keepOut', keepOutId: id });
			if (inward !== null || outward !== null) {
				constraints.push({
					kind: 'displacement',
					...(inward === null ? {} : { inward }),
					...(outward === null ? {} : { outward }),
					...(this.used.some((b) => b.id === this.boundedIn) ? { boxId: this.boundedIn! } : {})
				});
			}
			if (this.thickness !== null) constraints.push({ kind: 'thickness', least: this.thickness });
		}
		if (this.radius !== null) constraints.push({ kind: 'radius', least: this.radius });
		const symmetry = this.study()?.symmetry;
		return {
			boxIds: this.used.map((b) => b.id),
			mode: this.mode,
			step: this.step,
			smoothing: this.smoothing,
			...(Object.keys(this.weights).length ? { weights: this.weights } : {}),
			lockIds: this.keeping.locks.filter((l) => this.locks(l.id)).map((l) => l.id),
			...(symmetry ? { symmetry: this.symmetric } : {}),
			...(this.mode === 'lattice' ? this.hand.recipe(this.used) : {}),
			constraints
		};
	});

	readonly #key = $derived.by(() =>
		JSON.stringify([
			this.shape()?.id,
			this.recipe,
			this.used.map(bodyOf),
			// What a keep-out or a lock says counts as much as which of them are kept.
			this.keeping.keepOuts.map(({ version: _v, updatedAt: _u, ...k }) => k),
			this.keeping.locks.map(({ version: _v, updatedAt: _u, ...l }) => l),
			this.study()?.symmetry
		])
	);

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
		return this.boxes.dragging || this.keeping.dragging ? null : this.#key;
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
		if (!shape || this.obstacle || this.due === null) return;
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
				await this.keeping.flush();
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

	keeps(keepOutId: string): boolean {
		return !this.leftOut.includes(keepOutId);
	}

	locks(lockId: string): boolean {
		return !this.leftOut.includes(lockId);
	}

	leaveOut(id: string, out: boolean) {
		const others = this.leftOut.filter((o) => o !== id);
		this.leftOut = out ? [...others, id] : others;
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
