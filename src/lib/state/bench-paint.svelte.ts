import type { Lock } from '$lib/api/schemas/drawn';
import type { Shape } from '$lib/api/schemas/shapes';
import type { DesignBox } from '$lib/morph';
import type { Reach, Sight } from '$lib/workers/display-protocol';
import { runsOf } from './bench-geometry';
import type { KeepingState } from './bench-keeping.svelte';

export type PaintTool = 'brush' | 'fill' | 'box';

const DEGREE = Math.PI / 180;
const KEPT_STROKES = 50;

/**
 * Painting a lock on the surface: strokes are gathered here and stored as the lock's next version when they end. `for` is
 * the lock that is painted; a new one is made by the first stroke.
 */
export class PaintState {
	/** null: nobody paints. */
	for = $state.raw<{ lockId: string | null } | null>(null);
	tool = $state<PaintTool>('brush');
	/** Metres. */
	radius = $state(0.02);
	/** Degrees between neighbours, up to which a fill goes on. */
	angle = $state(20);
	/** Strokes unlock. */
	takeAway = $state(false);
	/** Painted triangles, ascending; a new array with each change. */
	painted = $state.raw<Uint32Array>(new Uint32Array());
	busy = $state(false);
	#mask = new Uint8Array();
	#before: Uint32Array | null = null;
	#strokes = $state.raw<Uint32Array[]>([]);
	#topologyId = '';

	constructor(
		readonly keeping: KeepingState,
		readonly reach: (input: Reach) => Promise<Uint32Array>
	) {}

	readonly active = $derived(this.for !== null);
	readonly canUndo = $derived(this.#strokes.length > 0);

	begin(shape: Shape, lock: Lock | null) {
		this.for = { lockId: lock?.id ?? null };
		this.#topologyId = shape.topologyId;
		this.#mask = new Uint8Array(shape.triangleCount);
		this.#strokes = [];
		// Paint on another mesh says nothing of this one's triangles: the first stroke replaces it.
		if (lock?.painted?.topologyId === shape.topologyId) {
			const { ranges } = lock.painted;
			for (let i = 0; i + 1 < ranges.length; i += 2) this.#mask.fill(1, ranges[i], ranges[i] + ranges[i + 1]);
		}
		this.#show();
	}

	end() {
		this.for = null;
		this.#before = null;
		this.#strokes = [];
		this.painted = new Uint32Array();
	}

	/** A stroke begins: what follows until `store` is one step back. */
	press() {
		this.#before ??= this.painted;
	}

	/** Paints what these lines of sight meet, as the tool does. */
	async stroke(sights: Sight[], on: 'rest' | 'moved') {
		if (this.tool === 'box') return;
		await this.#paint(
			this.tool === 'brush'
				? { kind: 'brush', sights, on, radius: this.radius }
				: { kind: 'fill', sights, on, angle: this.angle * DEGREE }
		);
	}

	/** Locks (or unlocks) what lies whole in a box. */
	async box(box: DesignBox) {
		this.press();
		await this.#paint({ kind: 'box', box });
		await this.store();
	}

	/** The stroke has ended. Rejects when it could not be stored; then it is not painted either. */
	async store() {
		const before = this.#before;
		this.#before = null;
		if (!before || same(before, this.painted)) return;
		try {
			await this.#save();
			this.#strokes = [...this.#strokes.slice(1 - KEPT_STROKES), before];
		} catch (cause) {
			this.#set(before);
			throw cause;
		}
	}

	async undo() {
		const before = this.#strokes.at(-1);
		if (!before || !this.for) return;
		const now = this.painted;
		this.#set(before);
		try {
			await this.#save();
			this.#strokes = this.#strokes.slice(0, -1);
		} catch (cause) {
			this.#set(now);
			throw cause;
		}
	}

	async #save() {
		const mode = this.for;
		if (!mode) return;
		const painted = this.painted.length > 0 ? { topologyId: this.#topologyId, ranges: runsOf(this.painted) } : null;
		if (mode.lockId === null) {
			if (!painted) return;
			this.busy = true;
			try {
				const lock = await this.keeping.addLock({ patches: [], painted });
				if (this.for === mode) this.for = { lockId: lock.id };
			} finally {
				this.busy = false;
			}
			return;
		}
		const lock = this.keeping.locks.find((l) => l.id === mode.lockId);
		if (!lock) throw new Error('The lock that was painted has been put away.');
		if (!painted && lock.patches.length === 0) {
			throw new Error('A lock holds at least one triangle or patch. To lock nothing, put the lock away.');
		}
		this.keeping.changeLock(lock.id, { painted });
		await this.keeping.flush();
	}

	async #paint(input: Reach) {
		const mode = this.for;
		const found = await this.reach(input);
		if (!mode || this.for === null) return;
		const value = this.takeAway ? 0 : 1;
		for (const t of found) this.#mask[t] = value;
		this.#show();
	}

	#set(triangles: Uint32Array) {
		this.#mask.fill(0);
		for (const t of triangles) this.#mask[t] = 1;
		this.#show();
	}

	#show() {
		const painted = new Uint32Array(this.#mask.reduce((sum, m) => sum + m, 0));
		for (let t = 0, at = 0; t < this.#mask.length; t++) if (this.#mask[t]) painted[at++] = t;
		this.painted = painted;
	}
}

const same = (a: Uint32Array, b: Uint32Array) => a.length === b.length && a.every((t, i) => t === b[i]);
