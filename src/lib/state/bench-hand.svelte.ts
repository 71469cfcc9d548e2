import type { Box } from '$lib/api/schemas/drawn';
import type { RecipeInput } from '$lib/api/schemas/moves';
import type { Vec3 } from '$lib/workers/display-protocol';

type Displacements = Record<string, number[]>;

const HISTORY = 200;
const sizeOf = ({ lattice }: Pick<Box, 'lattice'>) => 3 * lattice[0] * lattice[1] * lattice[2];

/** Control points moved by hand: added to the computed move, or in its place. Metres, world axes. */
export class HandState {
	mode = $state<'add' | 'replace'>('add');
	/** Chosen points of the selected box, ((i*nv)+j)*nw+k. */
	chosen = $state.raw<number[]>([]);
	#made = $state.raw<Displacements>({});
	#undo = $state.raw<Displacements[]>([]);
	#redo = $state.raw<Displacements[]>([]);

	readonly canUndo = $derived(this.#undo.length > 0);
	readonly canRedo = $derived(this.#redo.length > 0);

	/** What was moved of a box, nPoints x 3; null: nothing, or its lattice has changed since. */
	of(box: Pick<Box, 'id' | 'lattice'>): number[] | null {
		const made = this.#made[box.id];
		return made?.length === sizeOf(box) && made.some((x) => x !== 0) ? made : null;
	}

	at(box: Pick<Box, 'id' | 'lattice'>, point: number): Vec3 {
		const made = this.of(box);
		return made ? [made[3 * point], made[3 * point + 1], made[3 * point + 2]] : [0, 0, 0];
	}

	choose(points: number[], more = false) {
		if (!more) this.chosen = points;
		else {
			const here = new Set(this.chosen);
			for (const p of points) if (!here.delete(p)) here.add(p);
			this.chosen = [...here].sort((a, b) => a - b);
		}
	}

	/** Sets one component of the chosen points' displacement. */
	set(box: Pick<Box, 'id' | 'lattice'>, axis: 0 | 1 | 2, metres: number) {
		const next = (this.of(box) ?? new Array<number>(sizeOf(box)).fill(0)).slice();
		for (const p of this.chosen) next[3 * p + axis] = metres;
		this.#put({ ...this.#made, [box.id]: next });
	}

	clear(boxId: string) {
		const { [boxId]: _gone, ...rest } = this.#made;
		this.#put(rest);
	}

	undo() {
		const before = this.#undo.at(-1);
		if (!before) return;
		this.#redo = [...this.#redo, this.#made];
		this.#undo = this.#undo.slice(0, -1);
		this.#made = before;
	}

	redo() {
		const after = this.#redo.at(-1);
		if (!after) return;
		this.#undo = [...this.#undo, this.#made];
		this.#redo = this.#redo.slice(0, -1);
		this.#made = after;
	}

	/** What the recipe says of it, for the boxes of a move. */
	recipe(boxes: Box[]): Partial<Pick<RecipeInput, 'hand' | 'handMode'>> {
		const hand = boxes.flatMap((box) => {
			const displacement = this.of(box);
			return displacement ? [{ boxId: box.id, displacement }] : [];
		});
		return hand.length === 0 ? {} : { hand, handMode: this.mode };
	}

	#put(next: Displacements) {
		this.#undo = [...this.#undo, this.#made].slice(-HISTORY);
		this.#redo = [];
		this.#made = next;
	}
}
