import type { DescentConstraint } from './descent';
import { MorphError } from './errors';
import type { PlaceConstraint, PlaceRows } from './place-rows';
import type { MoveSpace } from './space';
import { dot } from './system';
import type { Bound, DisplacementBound, PlaceBound, Surface } from './types';

/** Places added to the small system in one round, the worst first. */
const ADDED_PER_ROUND = 24;
/** Kept away from a limit: what float32 coordinates can cross by rounding, and a share of the step. */
const FLOAT32_ULP = 1.2e-7;
const GUARD_OF_STEP = 1e-6;
/** A row this often in a round without binding is dropped. */
const IDLE_ROUNDS = 3;

/** One side of a place-by-place constraint over the vertices that may come near its limit. */
export interface PlaceSet {
	/** Of the constraint in the request. */
	index: number;
	kind: PlaceBound['kind'];
	bound: Bound;
	/** The constraint's own limit, in the sense of its bound. */
	limit: number;
	label: string;
	/** Over the vertices that the move can bring to the limit. */
	constraint: PlaceConstraint;
	/** The constraint's value from a place's: a displacement's sign differs. */
	sign: 1 | -1;
	/** Slack up to which places are looked at, metres. */
	within: number;
	/** Of the vertices that the parent has near the limit: by how much. */
	parentSlack: Map<number, number>;
}

const intersect = (moved: Uint32Array, wanted: Uint32Array | undefined): Uint32Array => {
	if (!wanted) return moved;
	const set = new Set(wanted);
	return moved.filter((v) => set.has(v));
};

/** Displacement along the parent's normals, at least -inward or at most outward. */
class NormalDisplacement implements PlaceConstraint {
	constructor(
		private readonly surface: Surface,
		private readonly vertices: Uint32Array,
		private readonly sign: 1 | -1,
		private readonly limit: number
	) {}

	rows(positions: Float64Array, within: number): PlaceRows {
		const { positions: rest, normals } = this.surface;
		const all = new Float64Array(this.vertices.length);
		let count = 0;
		this.vertices.forEach((v, i) => {
			let value = 0;
			for (let d = 0; d < 3; d++) value += (positions[3 * v + d] - rest[3 * v + d]) * normals[3 * v + d];
			all[i] = this.sign * value;
			if (all[i] + this.limit < within) count++;
		});
		const rows: PlaceRows = {
			count,
			starts: Uint32Array.from({ length: count + 1 }, (_, k) => k),
			vertices: new Uint32Array(count),
			vectors: new Float64Array(3 * count),
			slack: new Float64Array(count),
			values: new Float64Array(count)
		};
		let k = 0;
		this.vertices.forEach((v, i) => {
			if (!(all[i] + this.limit < within)) return;
			rows.vertices[k] = v;
			for (let d = 0; d < 3; d++) rows.vectors[3 * k + d] = this.sign * normals[3 * v + d];
			rows.slack[k] = all[i] + this.limit;
			rows.values[k++] = all[i];
		});
		return rows;
	}
}

function displacementSets(
	{ inward, outward, vertices }: DisplacementBound,
	index: number,
	surface: Surface,
	moved: Uint32Array
): PlaceSet[] {
	const sides: [number | undefined, 1 | -1, Bound, string][] = [
		[inward, 1, 'atLeast', 'displacement inward'],
		[outward, -1, 'atMost', 'displacement outward']
	];
	const given = sides.filter(([value]) => value !== undefined) as [number, 1 | -1, Bound, string][];
	if (given.length === 0 || given.some(([value]) => !(value >= 0) || !Number.isFinite(value))) {
		throw new MorphError(
			'constraint-invalid',
			'A displacement bound needs how far inward or outward a vertex may go.',
			'Give inward, outward or both, 0 or more metres.',
			{ constraint: index }
		);
	}
	const meant = intersect(moved, vertices);
	return given.map(([value, sign, bound, label]) => ({
		index,
		kind: 'displacement',
		bound,
		limit: sign === 1 ? -value : value,
		label,
		constraint: new NormalDisplacement(surface, meant, sign, value),
		sign,
		within: Infinity,
		parentSlack: value === 0 ? new Map(Array.from(meant, (v) => [v, 0])) : new Map<number, number>()
	}));
}

/**
 * @param reach how far any vertex can come, metres: places farther than that from their limit are left out
 * @throws MorphError constraint-invalid
 */
export function placeSets(
	constraint: PlaceBound,
	index: number,
	surface: Surface,
	moved: Uint32Array,
	reach: number
): PlaceSet[] {
	if (constraint.kind === 'displacement') return displacementSets(constraint, index, surface, moved);
	const { source, label, limit, kind } = constraint;
	const meant = intersect(moved, constraint.vertices);
	// Two walls can come towards each other.
	const near = source.place(meant).rows(surface.positions, 2 * reach);
	const ids = Uint32Array.from({ length: near.count }, (_, k) => near.vertices[near.starts[k]]).sort();
	const parentSlack = new Map<number, number>();
	for (let k = 0; k < near.count; k++) parentSlack.set(near.vertices[near.starts[k]], near.slack[k]);
	return [
		{
			index,
			kind,
			bound: 'atLeast',
			limit,
			label,
			constraint: source.place(ids),
			sign: 1,
			within: 4 * reach,
			parentSlack
		}
	];
}

/** A place in the small system. */
interface PlaceRow extends DescentConstraint {
	set: PlaceSet;
	vertex: number;
	idle: number;
}

/** What a round found. */
export interface Violations {
	/** The worst by which a limit is broken, metres; 0 when none is. */
	worst: number;
	/** Labels of the sets that are broken, the worst first. */
	labels: string[];
}

/** The places that the rounds have brought into the small system. */
export class PlaceRounds {
	rows: PlaceRow[] = [];
	/** The rows that the last solution was found with. */
	binding: PlaceRow[] = [];
	private readonly guard: number;

	constructor(
		private readonly space: MoveSpace,
		private readonly surface: Surface,
		readonly sets: PlaceSet[],
		step: number
	) {
		let largest = 0;
		const { positions } = surface;
		for (const v of space.moved) {
			for (let d = 0; d < 3; d++) largest = Math.max(largest, Math.abs(positions[3 * v + d]));
		}
		this.guard = 2 * FLOAT32_ULP * largest + GUARD_OF_STEP * step;
	}

	/**
	 * Linearises at the present positions: rows at hand anew, and the worst of the places that break their limit.
	 *
	 * @param positions N x 3, moved
	 * @param computed moved x 3: the displacement less what was made by hand
	 * @param active of the rows at hand
	 */
	next(positions: Float64Array, computed: Float64Array, active: boolean[]): Violations {
		this.binding = this.rows;
		this.rows.forEach((row, i) => {
			row.likely = active[i];
			row.idle = active[i] ? 0 : row.idle + 1;
		});
		const kept = new Map(
			this.rows
				.filter((row) => row.idle < IDLE_ROUNDS)
				.map((row) => [`${this.sets.indexOf(row.set)} ${row.vertex}`, row])
		);
		const rows: PlaceRow[] = [];
		const broken: { set: PlaceSet; rows: PlaceRows; k: number; slack: number }[] = [];
		this.sets.forEach((set, s) => {
			const found = set.constraint.rows(positions, this.guard);
			for (let k = 0; k < found.count; k++) {
				const key = `${s} ${found.vertices[found.starts[k]]}`;
				const old = kept.get(key);
				const slack = found.slack[k] - this.target(set, found.vertices[found.starts[k]]);
				if (slack < -0.5 * this.guard) broken.push({ set, rows: found, k, slack });
				if (!old) continue;
				const row = this.row(set, found, k, computed, old);
				if (row) rows.push(row);
				kept.delete(key);
			}
		});
		// Rows that lie well within their limit now stay as they were: they may bind again.
		for (const row of kept.values()) rows.push(row);
		broken.sort((a, b) => a.slack - b.slack);
		const present = new Set(rows.map((row) => `${row.label} ${row.vertex}`));
		const picked: { set: PlaceSet; vertex: number }[] = [];
		for (const { set, rows: found, k } of broken) {
			if (picked.length === ADDED_PER_ROUND) break;
			const vertex = found.vertices[found.starts[k]];
			if (present.has(`${set.label} ${vertex}`)) continue;
			if (picked.some((p) => p.set === set && this.near(p.vertex, vertex, positions))) continue;
			const row = this.row(set, found, k, computed, null);
			if (!row) continue;
			picked.push({ set, vertex });
			rows.push(row);
		}
		this.rows = rows;
		return { worst: broken.length > 0 ? -broken[0].slack : 0, labels: [...new Set(broken.map((b) => b.set.label))] };
	}

	/**
	 * What a place's slack must come to: a guard above its limit, or what the parent has where that is less. A parent that
	 * breaks a limit by more than rounding is brought back to it.
	 */
	private target(set: PlaceSet, vertex: number): number {
		const parent = set.parentSlack.get(vertex) ?? Infinity;
		return parent < -this.guard ? this.guard : Math.min(this.guard, parent);
	}

	private near(a: number, b: number, positions: Float64Array): boolean {
		let sum = 0;
		for (let d = 0; d < 3; d++) sum += (positions[3 * a + d] - positions[3 * b + d]) ** 2;
		return sum < this.space.spacing ** 2;
	}

	private row(
		set: PlaceSet,
		found: PlaceRows,
		k: number,
		computed: Float64Array,
		old: PlaceRow | null
	): PlaceRow | null {
		const row = this.space.placeRow(found, k);
		// A vertex that nothing moves cannot be helped.
		if (dot(row, row) === 0) return null;
		const vertex = found.vertices[found.starts[k]];
		const solved = this.space.solve(row);
		let here = 0;
		for (let t = found.starts[k]; t < found.starts[k + 1]; t++) {
			const i = this.slot(found.vertices[t]);
			if (i < 0) continue;
			for (let d = 0; d < 3; d++) here += found.vectors[3 * t + d] * computed[3 * i + d];
		}
		return {
			row,
			solved,
			field: null,
			bound: 'atLeast',
			tolerance: 0.1 * this.guard,
			change: this.target(set, vertex) - found.slack[k] + here,
			label: set.label,
			set,
			vertex,
			idle: old?.idle ?? 0,
			likely: old?.likely ?? true
		};
	}

	private slots: Int32Array | null = null;

	private slot(vertex: number): number {
		if (!this.slots) {
			this.slots = new Int32Array(this.surface.positions.length / 3).fill(-1);
			this.space.moved.forEach((v, i) => ((this.slots as Int32Array)[v] = i));
		}
		return this.slots[vertex];
	}
}

/** The worst value of a set at some positions, and where. */
export function worstPlace(
	set: PlaceSet,
	positions: Float64Array
): { value: number; slack: number; vertex: number } | null {
	const found = set.constraint.rows(positions, set.within);
	let best = -1;
	for (let k = 0; k < found.count; k++) if (best < 0 || found.slack[k] < found.slack[best]) best = k;
	return best < 0
		? null
		: { value: set.sign * found.values[best], slack: found.slack[best], vertex: found.vertices[found.starts[best]] };
}
