import { api, asProblem, type ApiProblem } from '$lib/api/client';
import type { Box, BoxCreate } from '$lib/api/schemas/drawn';
import { toAngles } from './bench-geometry';

export type SaveState = 'saved' | 'waiting' | 'saving' | 'failed';

/** What can be taken back. A removed box comes back through the server's restore; nothing is ever deleted there. */
type Edit =
	| { kind: 'change'; id: string; before: BoxCreate; after: BoxCreate }
	| { kind: 'create'; id: string }
	| { kind: 'remove'; id: string };

const SAVE_AFTER_MS = 700;
const HISTORY = 200;

/** What of a box people edit. */
export function bodyOf(box: Box): BoxCreate {
	const { name, centre, halfSize, rotation, lattice, basis, degree, held, heldPoints, axes, frame } = box;
	return {
		name,
		centre: [...centre],
		halfSize: [...halfSize],
		rotation: [...rotation],
		lattice: [...lattice],
		basis,
		...(degree === undefined ? {} : { degree }),
		held: { ...held },
		heldPoints: [...heldPoints],
		axes: [...axes],
		frame
	};
}

const same = (a: BoxCreate, b: BoxCreate) => JSON.stringify(a) === JSON.stringify(b);

/**
 * The study's design boxes as the page has them: edited at once, saved a moment later, taken back and done again. The page's
 * copy leads; a save that fails keeps it and can be tried again.
 */
export class BoxesState {
	list = $state.raw<Box[]>([]);
	selectedId = $state<string | null>(null);
	/** While a handle is held: edits join into one. */
	dragging = $state(false);
	saves = $state.raw<Record<string, { state: SaveState; problem: ApiProblem | null }>>({});
	#undo = $state.raw<Edit[]>([]);
	#redo = $state.raw<Edit[]>([]);
	#gesture: { id: string; before: BoxCreate } | null = null;
	readonly #timers: Record<string, ReturnType<typeof setTimeout>> = {};
	readonly #running: Record<string, Promise<void>> = {};

	/** `stored`: called with the list whenever the server has a new version of it. */
	constructor(
		readonly studyId: string,
		readonly editable: () => boolean,
		readonly stored: (list: Box[]) => void
	) {}

	readonly selected = $derived(this.list.find((b) => b.id === this.selectedId) ?? null);
	readonly canUndo = $derived(this.#undo.length > 0);
	readonly canRedo = $derived(this.#redo.length > 0);
	/** The worst of the boxes' saves: what the page says. */
	readonly saveState = $derived.by((): SaveState => {
		const states = Object.values(this.saves).map((s) => s.state);
		return (['failed', 'saving', 'waiting'] as const).find((s) => states.includes(s)) ?? 'saved';
	});
	readonly saveProblem = $derived(Object.values(this.saves).find((s) => s.problem)?.problem ?? null);

	byId(id: string): Box | undefined {
		return this.list.find((b) => b.id === id);
	}

	/** Degrees about x, y, z. */
	anglesOf(box: Box) {
		return toAngles(box.rotation);
	}

	/** The server's list; boxes with edits of ours on the way keep them. */
	adopt(boxes: Box[]) {
		const ours = (id: string) => this.saves[id] && this.saves[id].state !== 'saved';
		const kept = this.list.filter((b) => ours(b.id));
		this.list = [
			...boxes.map((b) => kept.find((k) => k.id === b.id) ?? b),
			...kept.filter((k) => !boxes.some((b) => b.id === k.id))
		];
		if (this.selectedId && !this.byId(this.selectedId)) this.selectedId = null;
	}

	select(id: string | null) {
		this.selectedId = id;
	}

	/** Begins a drag: what follows until `end` is one step back. */
	begin(id: string) {
		const box = this.byId(id);
		if (!box || !this.editable()) return;
		this.#gesture = { id, before: bodyOf(box) };
		this.dragging = true;
	}

	end() {
		const gesture = this.#gesture;
		this.#gesture = null;
		this.dragging = false;
		const box = gesture && this.byId(gesture.id);
		if (!gesture || !box || same(gesture.before, bodyOf(box))) return;
		this.#record({ kind: 'change', id: box.id, before: gesture.before, after: bodyOf(box) });
		this.#saveLater(box.id);
	}

	/** Ends a drag as if it had not been. */
	abandon() {
		const gesture = this.#gesture;
		this.#gesture = null;
		this.dragging = false;
		if (gesture) this.#put(gesture.id, gesture.before);
	}

	change(id: string, patch: Partial<BoxCreate>) {
		const box = this.byId(id);
		if (!box || !this.editable()) return;
		const before = bodyOf(box);
		const after = { ...before, ...patch };
		if (same(before, after)) return;
		this.#put(id, after);
		if (this.#gesture?.id === id) return;
		this.#record({ kind: 'change', id, before, after });
		this.#saveLater(id);
	}

	async create(body: BoxCreate): Promise<Box> {
		const box = await api.createBox({ id: this.studyId, body });
		this.#appear(box);
		this.#record({ kind: 'create', id: box.id });
		return box;
	}

	/** `stem n` for the first n that no box has. */
	freeName(stem: string, n: number): string {
		while (this.list.some((b) => b.name === `${stem} ${n}`)) n++;
		return `${stem} ${n}`;
	}

	async duplicate(id: string): Promise<Box | null> {
		const box = this.byId(id);
		if (!box) return null;
		return this.create({ ...bodyOf(box), name: this.freeName(box.name, 2) });
	}

	async remove(id: string) {
		await this.#vanish(id);
		this.#record({ kind: 'remove', id });
	}

	async undo() {
		const edit = this.#undo.at(-1);
		if (!edit || this.dragging) return;
		this.#undo = this.#undo.slice(0, -1);
		await this.#apply(edit, 'back').catch((cause: unknown) => {
			this.#undo = [...this.#undo, edit];
			throw cause;
		});
		this.#redo = [...this.#redo, edit];
	}

	async redo() {
		const edit = this.#redo.at(-1);
		if (!edit || this.dragging) return;
		this.#redo = this.#redo.slice(0, -1);
		await this.#apply(edit, 'again').catch((cause: unknown) => {
			this.#redo = [...this.#redo, edit];
			throw cause;
		});
		this.#undo = [...this.#undo, edit];
	}

	/** Saves what waits, now. Rejects when something could not be saved. */
	async flush() {
		for (const id of Object.keys(this.#timers)) this.#saveNow(id);
		await Promise.all(Object.values(this.#running));
		if (this.saveProblem) throw this.saveProblem;
	}

	retry() {
		for (const [id, save] of Object.entries(this.saves)) if (save.state === 'failed') this.#saveNow(id);
	}

	async #apply(edit: Edit, way: 'back' | 'again') {
		if (edit.kind === 'change') {
			this.#put(edit.id, way === 'back' ? edit.before : edit.after);
			this.selectedId = edit.id;
			this.#saveLater(edit.id);
		} else if ((edit.kind === 'create') === (way === 'back')) {
			await this.#vanish(edit.id);
		} else {
			this.#appear(await api.restoreBox({ id: edit.id }));
		}
	}

	#record(edit: Edit) {
		this.#undo = [...this.#undo, edit].slice(-HISTORY);
		this.#redo = [];
	}

	#put(id: string, body: BoxCreate) {
		this.list = this.list.map((b) => (b.id === id ? { ...b, ...body } : b));
	}

	#appear(box: Box) {
		this.list = [...this.list.filter((b) => b.id !== box.id), box];
		this.selectedId = box.id;
		this.stored(this.list);
	}

	async #vanish(id: string) {
		this.#unwait(id);
		await this.#running[id];
		await api.removeBox({ id });
		this.list = this.list.filter((b) => b.id !== id);
		const { [id]: _gone, ...rest } = this.saves;
		this.saves = rest;
		if (this.selectedId === id) this.selectedId = null;
		this.stored(this.list);
	}

	#mark(id: string, state: SaveState, problem: ApiProblem | null = null) {
		this.saves = { ...this.saves, [id]: { state, problem } };
	}

	#unwait(id: string) {
		clearTimeout(this.#timers[id]);
		delete this.#timers[id];
	}

	#saveLater(id: string) {
		clearTimeout(this.#timers[id]);
		this.#mark(id, 'waiting');
		this.#timers[id] = setTimeout(() => this.#saveNow(id), SAVE_AFTER_MS);
	}

	#saveNow(id: string) {
		this.#unwait(id);
		// One save of a box after the other: a later one must not overtake an earlier one.
		const turn = (this.#running[id] ?? Promise.resolve()).then(() => this.#save(id));
		this.#running[id] = turn;
		void turn.then(() => {
			if (this.#running[id] === turn) delete this.#running[id];
		});
	}

	async #save(id: string) {
		const box = this.byId(id);
		if (!box) return;
		const body = bodyOf(box);
		this.#mark(id, 'saving');
		try {
			const { version, updatedAt } = await api.replaceBox({ id, body });
			this.list = this.list.map((b) => (b.id === id ? { ...b, version, updatedAt } : b));
			const now = this.byId(id);
			if (now && same(bodyOf(now), body) && !(id in this.#timers)) this.#mark(id, 'saved');
			this.stored(this.list);
		} catch (cause) {
			this.#mark(id, 'failed', asProblem(cause));
		}
	}
}
