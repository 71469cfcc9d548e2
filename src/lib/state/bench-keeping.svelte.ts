import { api, apiPath, asProblem, problemFromText, type ApiProblem } from '$lib/api/client';
import type { KeepOut, KeepOutDefinition, Lock, LockCreate } from '$lib/api/schemas/drawn';
import type { Study } from '$lib/api/schemas/studies';
import type { Vec3 } from '$lib/workers/display-protocol';

/** An uploaded keep-out's surface, metres. */
export interface KeepOutMesh {
	positions: Float32Array;
	triangles: Uint32Array;
}

export type LimitKind = 'keepOut' | 'lock';

/** What of a keep-out can be changed. */
export type KeepOutPatch = Partial<Pick<KeepOutDefinition, 'name' | 'side' | 'clearance'>> & {
	geometry?: Exclude<KeepOutDefinition['geometry'], { kind: 'mesh' }>;
};

/** Where the surface must not go and what a move leaves alone: the study's keep-outs and locks as the page has them. */
export class KeepingState {
	keepOuts = $state.raw<KeepOut[]>([]);
	locks = $state.raw<Lock[]>([]);
	selected = $state.raw<{ kind: LimitKind; id: string } | null>(null);
	/** Surfaces of uploaded keep-outs, as far as they have come. */
	meshes = $state.raw<Record<string, KeepOutMesh>>({});
	problem = $state.raw<ApiProblem | null>(null);
	saving = $state(0);
	/** A keep-out is being dragged: it is stored when it is let go. */
	dragging = $state(false);
	#gesture: KeepOut | null = null;
	/** Saves of one thing follow each other: each is made on the version that the one before gave. */
	readonly #turns: Record<string, Promise<void>> = {};
	/** Edits of one thing that are shown and not on their way yet. */
	readonly #waiting: Record<string, number> = {};
	readonly #asked = new Set<string>();

	/** `stored`: called with both lists whenever the server has something new. */
	constructor(
		readonly studyId: string,
		readonly metresPerUnit: () => number,
		readonly stored: (limits: Pick<Study, 'keepOuts' | 'locks'>) => void
	) {}

	readonly keepOut = $derived(
		this.selected?.kind === 'keepOut' ? (this.keepOuts.find((k) => k.id === this.selected?.id) ?? null) : null
	);
	readonly lock = $derived(
		this.selected?.kind === 'lock' ? (this.locks.find((l) => l.id === this.selected?.id) ?? null) : null
	);

	adopt({ keepOuts, locks }: Pick<Study, 'keepOuts' | 'locks'>) {
		if (this.saving > 0 || this.dragging) return;
		this.keepOuts = keepOuts;
		this.locks = locks;
		for (const keepOut of keepOuts) if (keepOut.geometry.kind === 'mesh') void this.#fetchMesh(keepOut.id);
	}

	toggle(kind: LimitKind, id: string) {
		const same = this.selected?.kind === kind && this.selected.id === id;
		this.selected = same ? null : { kind, id };
	}

	freeName(stem: string, taken: { name: string }[]): string {
		let n = taken.length + 1;
		while (taken.some((t) => t.name === `${stem} ${n}`)) n++;
		return `${stem} ${n}`;
	}

	/** A plane above a place, or a box around it; `size` metres. */
	async addKeepOut(kind: 'halfSpace' | 'box', around: Vec3, outward: Vec3, size: number) {
		const name = this.freeName(kind === 'box' ? 'Keep-out box' : 'Keep-out plane', this.keepOuts);
		const away = (distance: number) => around.map((x, k) => x + distance * outward[k]) as Vec3;
		const axis = outward.map(Math.abs).indexOf(Math.max(...outward.map(Math.abs)));
		const normal = [0, 1, 2].map((k) => (k === axis ? -Math.sign(outward[k]) : 0)) as Vec3;
		const geometry =
			kind === 'box'
				? {
						kind,
						centre: away(0.75 * size),
						halfSize: [0.5 * size, 0.5 * size, 0.5 * size] as Vec3,
						rotation: turned()
					}
				: { kind, point: away(0.1 * size), normal };
		const made = await api.createKeepOut({
			id: this.studyId,
			body: { name, side: 'outside', clearance: 0, geometry }
		});
		this.#put('keepOut', made);
		this.selected = { kind: 'keepOut', id: made.id };
	}

	async addLock(body: Pick<LockCreate, 'patches' | 'painted'>): Promise<Lock> {
		const name = this.freeName('Lock', this.locks);
		const made = await api.createLock({ id: this.studyId, body: { name, blend: 0, ...body } });
		this.#put('lock', made);
		this.selected = { kind: 'lock', id: made.id };
		return made;
	}

	changeKeepOut(id: string, patch: KeepOutPatch) {
		const before = this.keepOuts.find((k) => k.id === id);
		if (!before) return;
		this.#show('keepOut', { ...before, ...patch });
		if (this.#gesture?.id === id) return;
		void this.#save(id, async () => {
			const { name, side, clearance, geometry, version } = this.keepOuts.find((k) => k.id === id)!;
			const body = { name, side, clearance, version, ...(geometry.kind === 'mesh' ? {} : { geometry }) };
			this.#settle('keepOut', await api.replaceKeepOut({ id, body }));
		});
	}

	/** Begins a drag: what follows until `end` is one version. */
	begin(keepOut: KeepOut) {
		this.#gesture = keepOut;
		this.dragging = true;
	}

	end() {
		const before = this.#gesture;
		this.#gesture = null;
		this.dragging = false;
		const now = before && this.keepOuts.find((k) => k.id === before.id);
		if (!now || now.geometry === before.geometry || now.geometry.kind === 'mesh') return;
		this.changeKeepOut(now.id, { geometry: now.geometry });
	}

	/** Ends a drag as if it had not been. */
	abandon() {
		const before = this.#gesture;
		this.#gesture = null;
		this.dragging = false;
		const now = before && this.keepOuts.find((k) => k.id === before.id);
		if (now) this.#show('keepOut', { ...now, geometry: before.geometry });
	}

	changeLock(id: string, patch: Partial<LockCreate>) {
		const before = this.locks.find((l) => l.id === id);
		if (!before) return;
		this.#show('lock', { ...before, ...patch });
		void this.#save(id, async () => {
			const { name, patches, painted, blend, version } = this.locks.find((l) => l.id === id)!;
			this.#settle('lock', await api.replaceLock({ id, body: { name, patches, painted, blend, version } }));
		});
	}

	async remove(kind: LimitKind, id: string) {
		await this.#turns[id];
		if (kind === 'keepOut') await api.removeKeepOut({ id });
		else await api.removeLock({ id });
		if (kind === 'keepOut') this.keepOuts = this.keepOuts.filter((k) => k.id !== id);
		else this.locks = this.locks.filter((l) => l.id !== id);
		if (this.selected?.id === id) this.selected = null;
		this.#tell();
	}

	async restore(kind: LimitKind, id: string) {
		if (kind === 'keepOut') this.#put('keepOut', await api.restoreKeepOut({ id }));
		else this.#put('lock', await api.restoreLock({ id }));
		this.selected = { kind, id };
	}

	/** Everything that was changed is stored. Rejects when something could not be. */
	async flush() {
		await Promise.all(Object.values(this.#turns));
		if (this.problem) throw this.problem;
	}

	#save(id: string, work: () => Promise<void>): Promise<void> {
		this.#waiting[id] = (this.#waiting[id] ?? 0) + 1;
		const turn = (this.#turns[id] ?? Promise.resolve()).then(async () => {
			this.#waiting[id]--;
			this.saving++;
			try {
				await work();
				this.problem = null;
			} catch (cause) {
				this.problem = asProblem(cause);
				// What is shown must be what is stored: the server's state comes back.
				const study = await api.getStudy({ id: this.studyId }).catch(() => null);
				if (study) {
					this.keepOuts = study.keepOuts;
					this.locks = study.locks;
				}
			} finally {
				this.saving--;
			}
		});
		this.#turns[id] = turn;
		return turn;
	}

	#show(kind: LimitKind, thing: KeepOut | Lock) {
		if (kind === 'keepOut') this.keepOuts = put(this.keepOuts, thing as KeepOut);
		else this.locks = put(this.locks, thing as Lock);
	}

	/** What a save gave. Of an edit that was made meanwhile only the version is new: the edit's own save is based on it. */
	#settle(kind: LimitKind, stored: KeepOut | Lock) {
		const { id, version } = stored;
		const list: (KeepOut | Lock)[] = kind === 'keepOut' ? this.keepOuts : this.locks;
		const shown = list.find((thing) => thing.id === id);
		if (shown && (this.#waiting[id] > 0 || this.#gesture?.id === id)) this.#show(kind, { ...shown, version });
		else this.#put(kind, stored);
	}

	#put(kind: LimitKind, thing: KeepOut | Lock) {
		this.#show(kind, thing);
		if (kind === 'keepOut' && (thing as KeepOut).geometry.kind === 'mesh') void this.#fetchMesh(thing.id);
		this.#tell();
	}

	#tell() {
		this.stored({ keepOuts: this.keepOuts, locks: this.locks });
	}

	async #fetchMesh(id: string) {
		if (this.#asked.has(id)) return;
		this.#asked.add(id);
		try {
			const response = await fetch(apiPath('getKeepOutMesh', { id }));
			if (!response.ok) throw problemFromText(response.status, response.statusText, await response.text());
			const bytes = await response.arrayBuffer();
			const [vertices, triangles] = new Uint32Array(bytes, 0, 2);
			const scale = this.metresPerUnit();
			const positions = new Float32Array(bytes, 8, 3 * vertices).map((x) => x * scale);
			this.meshes = {
				...this.meshes,
				[id]: { positions, triangles: new Uint32Array(bytes, 8 + 12 * vertices, 3 * triangles) }
			};
		} catch (cause) {
			this.#asked.delete(id);
			this.problem = asProblem(cause);
		}
	}
}

const turned = (): [number, number, number, number] => [0, 0, 0, 1];

const put = <T extends { id: string }>(list: T[], thing: T): T[] =>
	list.some((t) => t.id === thing.id) ? list.map((t) => (t.id === thing.id ? thing : t)) : [...list, thing];
