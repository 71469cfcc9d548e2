import { getContext, setContext } from 'svelte';
import { apiPath, asProblem, problemFromText, type ApiProblem } from '$lib/api/client';
import type { Box, BoxCreate, KeepOut, Lock } from '$lib/api/schemas/drawn';
import type { SensitivityMap } from '$lib/api/schemas/maps';
import type { Shape, ShapeSummary } from '$lib/api/schemas/shapes';
import type { Study } from '$lib/api/schemas/studies';
import { metresPerUnit } from '$lib/format/units';
import { DisplayWorker } from '$lib/workers/display';
import type {
	DisplayField,
	DisplayMesh,
	DisplayMove,
	FieldName,
	Pick,
	Share,
	Vec3
} from '$lib/workers/display-protocol';
import { sameBaseline } from './bench-lineage';
import { designBox, lockedTriangles, roundTo, shownMove, type Ray } from './bench-geometry';
import { BoxesState } from './bench-boxes.svelte';
import { KeepingState } from './bench-keeping.svelte';
import { PaintState } from './bench-paint.svelte';
import { MoveState, type Preview } from './bench-move.svelte';

export type Layer = FieldName | 'none';
export type Exaggeration = 1 | 5 | 20;
export const exaggerations: Exaggeration[] = [1, 5, 20];

/** What is read off under the cursor, in this order. */
export const pickedFields = ['map', 'move', 'gain', 'distance'] as const satisfies readonly FieldName[];

const PER_MM = 1e-3;
export const HISTOGRAM_BINS = 48;
/** The legend's bar reaches this far past the robust limit, so that the limit can be dragged outward too. */
const LEGEND_REACH = 1.5;

export interface Histogram {
	field: FieldName;
	extent: number;
	shares: Float32Array;
}

/** Everything that the Bench of one study shows and does. The page hands in what the server says; the viewport looks at it. */
export class BenchState {
	study = $state.raw<Study | null>(null);
	shapes = $state.raw<ShapeSummary[]>([]);
	shape = $state.raw<Shape | null>(null);

	mesh = $state.raw<DisplayMesh | null>(null);
	/** Id of the shape whose surface is in `mesh`. */
	meshOf = $state<string | null>(null);
	loading = $state(false);
	problem = $state.raw<ApiProblem | null>(null);

	layer = $state<Layer>('map');
	mapId = $state<string | null>(null);
	/** Chosen to measure distances from; null: the parent. */
	distanceId = $state<string | null>(null);
	fields = $state.raw<Partial<Record<FieldName, DisplayField>>>({});
	/** Set by hand; null: the robust limit. */
	limits = $state.raw<Partial<Record<FieldName, number>>>({});
	histogram = $state.raw<Histogram | null>(null);

	moved = $state.raw<DisplayMove | null>(null);
	showMoved = $state(true);
	/** While the key for the old surface is held. */
	peek = $state(false);
	exaggeration = $state<Exaggeration>(1);

	pick = $state.raw<Pick | null>(null);
	/** A place of the surface that was clicked: where a new box goes. */
	pinned = $state.raw<Vec3 | null>(null);
	share = $state.raw<Share | null>(null);
	/** While the smoothing length is being set its ring stands on the surface. */
	ringShown = $state(false);
	/** A place that the view should go to; a new object each time. */
	target = $state.raw<{ place: Vec3 } | null>(null);

	readonly boxes: BoxesState;
	readonly keeping: KeepingState;
	readonly move: MoveState;
	readonly paint: PaintState;
	/** By vertex, how much of a move the kept locks take away (1: all); null: no locks. */
	spared = $state.raw<Float32Array | null>(null);
	readonly #worker = new DisplayWorker();
	#loads = 0;
	#sharing = false;
	#shareDue = false;
	#settled = false;

	constructor(
		readonly studyId: string,
		readonly boxesStored: (list: Box[]) => void,
		keepingStored: (kept: { keepOuts: KeepOut[]; locks: Lock[] }) => void
	) {
		this.keeping = new KeepingState(studyId, () => this.metresPerUnit, keepingStored);
		this.boxes = new BoxesState(
			studyId,
			() => this.editable,
			(list) => this.boxesStored(list)
		);
		this.move = new MoveState(
			() => this.study,
			() => this.shape,
			this.boxes,
			this.keeping,
			(preview) => void this.#showMove(preview)
		);
		this.paint = new PaintState(this.keeping, (input) => this.#worker.ask('reach', input));
	}

	readonly editable = $derived(this.study?.role === 'engineer');
	/** Reviewers draw keep-outs too. */
	readonly mayDrawKeepOuts = $derived(this.study?.role === 'engineer' || this.study?.role === 'reviewer');
	readonly unit = $derived(this.study?.lengthUnit ?? 'mm');
	readonly metresPerUnit = $derived(metresPerUnit[this.unit]);
	readonly map = $derived.by((): SensitivityMap | null => {
		const maps = this.shape?.maps ?? [];
		return maps.find((m) => m.id === this.mapId) ?? maps[0] ?? null;
	});
	readonly parent = $derived(this.shapes.find((s) => s.id === this.shape?.parentId) ?? null);
	/** Shapes over the same triangles, by which distances can be measured: those of the same baseline. */
	readonly comparable = $derived(sameBaseline(this.shapes, this.shape?.id ?? null));
	/** The shape from which the layer of distances counts: the parent, unless another is chosen. */
	readonly distanceFrom = $derived(
		this.comparable.find((s) => s.id === this.distanceId) ?? this.parent ?? this.comparable[0] ?? null
	);
	readonly objectives = $derived(this.study?.objectives ?? []);
	/** The objective that the page speaks of first: the heaviest of those that are to get better. */
	readonly mainObjective = $derived.by(() => {
		const steering = this.objectives.filter((o) => o.sense !== 'hold');
		return [...steering].sort((a, b) => b.weight - a.weight)[0] ?? this.objectives[0] ?? null;
	});
	readonly field = $derived(this.layer === 'none' ? null : (this.fields[this.layer] ?? null));
	/** Full colour from here on; 0 when nothing is coloured. */
	readonly limit = $derived.by(() => {
		if (this.layer === 'none' || !this.field) return 0;
		return this.limits[this.layer] ?? this.field.spread.robust;
	});
	readonly extent = $derived(this.field ? Math.max(this.field.spread.robust * LEGEND_REACH, this.limit) : 0);
	/** The moved surface is what is to be seen. */
	readonly movedShown = $derived(this.moved !== null && this.showMoved && !this.peek);

	/** What the server says of the study, whenever it says so anew. */
	adopt(study: Study, shapes: ShapeSummary[]) {
		const first = this.study === null;
		this.study = study;
		this.shapes = shapes;
		this.boxes.adopt(study.boxes);
		this.keeping.adopt(study);
		if (first) {
			this.move.boxIds = study.boxes.map((b) => b.id);
			this.boxes.select(study.boxes[0]?.id ?? null);
		}
	}

	/** Goes to a shape: its surface, its map; the settings of the next move stay. */
	async open(shape: Shape) {
		const again = this.shape?.id === shape.id && this.meshOf === shape.id;
		this.shape = shape;
		if (!this.map || !shape.maps.some((m) => m.id === this.mapId)) this.mapId = shape.maps[0]?.id ?? null;
		if (again) {
			await this.#loadMap().catch((cause: unknown) => (this.problem = asProblem(cause)));
			return;
		}
		const load = ++this.#loads;
		this.loading = true;
		this.problem = null;
		this.move.cancel();
		this.#forgetMove();
		try {
			const [positions, triangles] = await Promise.all([
				bytes(apiPath('getPositions', { id: shape.id })),
				bytes(apiPath('getTriangles', { id: shape.topologyId }))
			]);
			if (load !== this.#loads) return;
			const scale = this.metresPerUnit;
			const mesh = await this.#worker.ask('load', { positions, triangles, metresPerUnit: scale }, [
				positions,
				triangles
			]);
			if (load !== this.#loads) return;
			this.fields = {};
			this.histogram = null;
			this.pick = this.share = this.spared = null;
			this.paint.end();
			this.mesh = mesh;
			this.meshOf = shape.id;
			if (!this.#settled) this.#settle(mesh);
			await this.#loadMap();
			if (this.layer === 'distance') await this.show('distance');
			else if (this.layer === 'map' && !this.map) this.layer = 'none';
		} catch (cause) {
			if (load === this.#loads) this.problem = asProblem(cause);
		} finally {
			if (load === this.#loads) this.loading = false;
		}
	}

	async show(layer: Layer) {
		if (layer === 'distance' && !this.fields.distance && !(await this.#measureDistance())) return;
		if (layer === 'gain' && !this.fields.gain) {
			if (!this.fields.map || !this.fields.move) layer = this.map ? 'map' : 'none';
			else await this.#keep('gain', this.#worker.ask('gain', {}));
		}
		this.layer = layer;
		await this.countHistogram();
	}

	async showMap(id: string) {
		this.mapId = id;
		this.layer = 'map';
		const { map: _old, ...limits } = this.limits;
		this.limits = limits;
		await this.#loadMap(true);
	}

	/** Another shape to measure distances from. */
	async measureFrom(id: string) {
		this.distanceId = id;
		const { distance: _old, ...fields } = this.fields;
		const { distance: _limit, ...limits } = this.limits;
		this.fields = fields;
		this.limits = limits;
		await this.show('distance');
	}

	setLimit(limit: number | null) {
		if (this.layer === 'none') return;
		const { [this.layer]: _old, ...rest } = this.limits;
		this.limits = limit === null ? rest : { ...rest, [this.layer]: limit };
	}

	async countHistogram() {
		const layer = this.layer;
		const extent = this.extent;
		if (layer === 'none' || extent === 0) {
			this.histogram = null;
			return;
		}
		const shares = await this.#worker.ask('histogram', { field: layer, extent, bins: HISTOGRAM_BINS });
		if (this.layer === layer) this.histogram = { field: layer, extent, shares };
	}

	async exaggerate(factor: Exaggeration) {
		this.exaggeration = factor;
		if (this.moved) this.moved = await this.#worker.ask('exaggerate', { exaggeration: factor });
	}

	/** What lies under a line of sight; null: nothing. */
	look(ray: Ray): Promise<Pick | null> {
		const on = this.movedShown ? 'moved' : 'rest';
		return this.#worker.ask('pick', { ...ray, on, fields: [...pickedFields] });
	}

	/** How much of the surface the selected box holds. While a handle moves, only the newest place is asked for. */
	async countShare() {
		this.#shareDue = true;
		if (this.#sharing) return;
		this.#sharing = true;
		try {
			while (this.#shareDue) {
				this.#shareDue = false;
				const box = this.boxes.selected;
				const field = this.fields.map ? 'map' : null;
				this.share = box && this.mesh ? await this.#worker.ask('share', { box: designBox(box), field }) : null;
			}
		} finally {
			this.#sharing = false;
		}
	}

	/** Where locks take the move away, wholly and over their blend distance. */
	async spare() {
		const { mesh, shape } = this;
		const locks = this.keeping.locks.filter((l) => this.move.locks(l.id));
		if (!mesh || !shape || locks.length === 0) {
			this.spared = null;
			return;
		}
		const due = ++this.#sparing;
		const spared = await this.#worker.ask('spared', {
			locks: locks.map((lock) => ({ triangles: lockedTriangles([lock], shape), blend: lock.blend }))
		});
		if (due === this.#sparing && this.mesh === mesh) this.spared = spared;
	}
	#sparing = 0;

	/** A new box around a place of the surface, sized from the shape. */
	async addBox(around: Vec3 | null): Promise<Box | null> {
		const { mesh, study } = this;
		if (!mesh || !study || !this.editable) return null;
		const size = ([0, 1, 2] as const).map((k) => mesh.bounds.max[k] - mesh.bounds.min[k]);
		const middle = ([0, 1, 2] as const).map((k) => (mesh.bounds.max[k] + mesh.bounds.min[k]) / 2) as Vec3;
		const longest = Math.max(...size);
		const least = longest * 0.02;
		const step = 10 ** Math.floor(Math.log10(longest / 200 / this.metresPerUnit)) * this.metresPerUnit;
		const rounded = (x: number) => roundTo(x, step);
		const centre = (around ?? middle).map(rounded) as Vec3;
		const halfSize = size.map((s) => Math.max(least, rounded(Math.min(s * 0.3, longest * 0.18)))) as Vec3;
		const body: BoxCreate = {
			name: this.boxes.freeName('Box', this.boxes.list.length + 1),
			centre,
			halfSize,
			rotation: [0, 0, 0, 1],
			lattice: [6, 5, 5],
			basis: 'bernstein',
			held: { u0: 0, u1: 0, v0: 0, v1: 0, w0: 0, w1: 0 },
			heldPoints: [],
			axes: ['x', 'y', 'z'],
			frame: 'box'
		};
		const box = await this.boxes.create(body);
		this.move.use(box.id, true);
		return box;
	}

	close() {
		this.move.cancel();
		this.#worker.close();
	}

	/** Step and smoothing that suit the size of what is on the Bench, or those of the move that made it. */
	#settle(mesh: DisplayMesh) {
		this.#settled = true;
		const { min, max } = mesh.bounds;
		const diagonal = Math.hypot(max[0] - min[0], max[1] - min[1], max[2] - min[2]);
		const one = (x: number) => Number(x.toPrecision(1));
		this.paint.radius = one(diagonal * 0.02);
		const newest = [...this.shapes].reverse().find((s) => s.step !== null);
		this.move.step = this.shape?.step ?? newest?.step ?? one(diagonal * 0.002);
		this.move.smoothing = this.shape?.smoothing ?? newest?.smoothing ?? one(diagonal * 0.012);
	}

	async #loadMap(again = false) {
		const map = this.map;
		if (!map || (this.#mapLoaded === map.id && this.fields.map && !again)) return;
		this.#mapLoaded = map.id;
		const values = await bytes(apiPath('getMapValues', { id: map.id }));
		if (this.map?.id !== map.id) return;
		await this.#keep('map', this.#worker.ask('map', { values, scale: PER_MM }, [values]));
		await this.#renewGain();
		if (this.layer === 'none') this.layer = 'map';
		await this.countHistogram();
	}
	#mapLoaded: string | null = null;

	async #showMove({ boxes, answer }: Preview) {
		try {
			const input = shownMove(answer, boxes, this.study?.symmetry ?? null);
			const moved = await this.#worker.ask('move', { ...input, exaggeration: this.exaggeration });
			if (this.move.preview?.answer !== answer) return;
			this.moved = moved;
			this.fields = { ...this.fields, move: moved.field };
			await this.#renewGain();
			if (this.layer === 'move' || this.layer === 'gain') await this.countHistogram();
		} catch (cause) {
			this.problem = asProblem(cause);
		}
	}

	#forgetMove() {
		this.moved = null;
		this.move.preview = null;
		const { move: _gone, gain: _with, ...fields } = this.fields;
		this.fields = fields;
		if (this.layer === 'move' || this.layer === 'gain') this.layer = 'map';
	}

	/** Map or move are new: what was made of both is made again when it is on show, else when it is asked for. */
	async #renewGain() {
		const { gain: _old, ...fields } = this.fields;
		if (this.layer === 'gain' && fields.map && fields.move) await this.#keep('gain', this.#worker.ask('gain', {}));
		else this.fields = fields;
	}

	/** False: another shape came meanwhile, or there is nothing to measure from. */
	async #measureDistance(): Promise<boolean> {
		const from = this.distanceFrom;
		const load = this.#loads;
		if (!from) return false;
		const positions = await bytes(apiPath('getPositions', { id: from.id }));
		if (load !== this.#loads || this.distanceFrom?.id !== from.id) return false;
		const input = { positions, metresPerUnit: this.metresPerUnit };
		await this.#keep('distance', this.#worker.ask('difference', input, [positions]));
		return true;
	}

	async #keep(name: FieldName, field: Promise<DisplayField>) {
		const value = await field;
		this.fields = { ...this.fields, [name]: value };
	}
}

async function bytes(url: string): Promise<ArrayBuffer> {
	const response = await fetch(url);
	if (!response.ok) throw problemFromText(response.status, response.statusText, await response.text());
	return response.arrayBuffer();
}

const KEY = Symbol('bench');

export const setBench = (bench: BenchState) => setContext(KEY, bench);
export const getBench = () => getContext<BenchState>(KEY);
