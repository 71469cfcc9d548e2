import { CholeskyDecomposition, Matrix } from 'ml-matrix';
import { boxDirections } from './box';
import { MorphError } from './errors';
import type { BoxOperator } from './operator';
import { reflectVector, type Tie } from './symmetry';
import type { Checkpoint, Surface } from './types';

/** Points of one box along one direction: what an unknown moves. */
interface Member {
	box: number;
	direction: Vec3;
	/** Control point of each unknown. */
	points: Uint32Array;
}

/** Unknowns that act alike: each moves a point of every member, two where mirror images are tied. */
interface Column {
	members: Member[];
	count: number;
	offset: number;
}

/** A block of unknowns that share nothing with the others. */
interface Group {
	columns: Column[];
	size: number;
	factor: CholeskyDecomposition;
	eps: number;
}

/** One vector of the reduced space: an array per group. */
export type Reduced = Float64Array[];

type Vec3 = [number, number, number];

const WORLD: Vec3[] = [
	[1, 0, 0],
	[0, 1, 0],
	[0, 0, 1]
];

const cosine = (a: Vec3, b: Vec3) => a[0] * b[0] + a[1] * b[1] + a[2] * b[2];
const parallel = (a: Vec3, b: Vec3) => Math.abs(cosine(a, b)) > 1 - 1e-14;
const opposite = (a: Vec3, b: Vec3) => cosine(a, b) < -1 + 1e-12;

/** The world's axes where the plane's normal is one of them, else any frame with the normal in it: what mirroring maps to itself. */
function mirrorFrame(normal: Vec3): Vec3[] {
	if (normal.some((x) => x === 1)) return WORLD;
	const [x, y, z] = normal;
	// Duff et al. 2017
	const sign = z >= 0 ? 1 : -1;
	const a = -1 / (sign + z);
	return [[1 + sign * x * x * a, sign * x * y * a, -sign * x], [x * y * a, sign + y * y * a, -y], normal];
}

/** Ascending ids in both ascending lists. */
function intersect(a: Uint32Array, b: Uint32Array): Uint32Array {
	const out: number[] = [];
	for (let i = 0, j = 0; i < a.length && j < b.length;) {
		if (a[i] < b[j]) i++;
		else if (a[i] > b[j]) j++;
		else {
			out.push(a[i]);
			i++;
			j++;
		}
	}
	return Uint32Array.from(out);
}

/**
 * The reduced metric H = T'B'W (M + r^2 K) W B T + eps: block by block where boxes share no vertex or where all move
 * along one common frame (then each axis has the same block, factored once).
 */
export class ReducedSystem {
	readonly groups: Group[] = [];
	readonly unknowns: number;

	/** @param ties mirror images among the operators' boxes; none: each box stands alone */
	constructor(
		private readonly operators: BoxOperator[],
		surface: Surface,
		smoothing: number,
		eps: number,
		private readonly ties: { list: Tie[]; normal: Vec3 } | null = null,
		checkpoint?: Checkpoint
	) {
		const count = operators.length;
		const own = operators.map((op, b) =>
			op.metric(surface, smoothing, checkpoint && ((f) => checkpoint((0.8 * (b + f)) / count)))
		);
		const cross = new Map<number, Float64Array>();
		const component = operators.map((_, b) => b);
		const join = (a: number, b: number) => {
			const from = component[a];
			const to = component[b];
			for (let c = 0; c < count; c++) if (component[c] === from) component[c] = to;
		};
		for (let a = 0; a < count; a++) {
			for (let b = 0; b < a; b++) {
				const both = intersect(operators[a].inside, operators[b].inside);
				if (both.length === 0) continue;
				cross.set(a * count + b, operators[a].crossMetric(operators[b], both, surface, smoothing));
				join(a, b);
			}
		}
		for (const { box, image } of ties?.list ?? []) join(box, image);
		checkpoint?.(0.85);
		for (const root of new Set(component)) {
			const members = operators.map((_, b) => b).filter((b) => component[b] === root);
			this.addComponent(members, own, cross, eps);
		}
		this.unknowns = this.groups.reduce((sum, g) => sum + g.size, 0);
		checkpoint?.(1);
	}

	/** The unknowns of some boxes: by direction of the first member. */
	private columnsOf(boxes: number[]): Column[] {
		const frame = this.ties ? mirrorFrame(this.ties.normal) : WORLD;
		const columns: Column[] = [];
		const add = (members: Member[]) => {
			if (members[0].points.length > 0) columns.push({ members, count: members[0].points.length, offset: 0 });
		};
		for (const box of boxes) {
			const operator = this.operators[box];
			// All three axes span the same space in any frame.
			const own = boxDirections(operator.box);
			const directions = own.length === 3 ? frame : own;
			const tie = this.ties?.list.find((t) => t.box === box);
			if (!this.ties) for (const direction of directions) add([{ box, direction, points: operator.free }]);
			if (!this.ties || !tie) continue;
			const other = this.operators[tie.image];
			for (const direction of directions) {
				const mirrored = reflectVector(direction, this.ties.normal);
				if (tie.image === box && own.length < 3 && !own.some((d) => parallel(d, mirrored))) {
					const label = operator.box.name ?? operator.box.id;
					throw new MorphError(
						'box-invalid',
						`Design box "${label}": the axes allowed are not symmetric about the study's symmetry plane.`,
						"Allow all three axes, or axes along and across the plane, or give the axes in the box's own frame.",
						{ box: label }
					);
				}
				// A pair held on one side is held on both; a point on the plane cannot leave it.
				const points = operator.free.filter((p) => {
					const q = tie.points[p];
					if (other.freeIndex[q] < 0) return false;
					if (tie.image !== box) return true;
					return p < q || (p === q && !opposite(direction, mirrored));
				});
				add([
					{ box, direction, points },
					{ box: tie.image, direction: mirrored, points: points.map((p) => tie.points[p]) }
				]);
			}
		}
		return columns;
	}

	private addComponent(members: number[], own: Float64Array[], cross: Map<number, Float64Array>, eps: number): void {
		const columns = this.columnsOf(members);
		if (columns.length === 0) return;
		const distinct: Vec3[] = [];
		for (const { members: list } of columns) {
			for (const { direction: d } of list) if (!distinct.some((e) => parallel(d, e))) distinct.push(d);
		}
		const orthogonal =
			distinct.every((d, i) => distinct.every((e, j) => i === j || Math.abs(cosine(d, e)) < 1e-14)) &&
			columns.every(({ members: [a, b] }) => !b || parallel(a.direction, b.direction));
		const factors = new Map<string, { factor: CholeskyDecomposition; eps: number }>();
		const add = (list: Column[], key: string | null) => {
			let size = 0;
			for (const column of list) {
				column.offset = size;
				size += column.count;
			}
			let made = key ? factors.get(key) : undefined;
			if (!made) {
				made = this.factorise(list, size, own, cross, eps);
				if (key) factors.set(key, made);
			}
			this.groups.push({ columns: list, size, ...made });
		};
		if (!orthogonal) return add(columns, null);
		for (const direction of distinct) {
			const list = columns.filter(({ members: [first] }) => parallel(first.direction, direction));
			// Even and odd pairs of mirrored points differ in their metric, the axes do not.
			const parity = list.map(
				({ members: [a, b] }) => `${a.box}${b ? Math.sign(cosine(a.direction, b.direction)) : ''}`
			);
			add(list, parity.join());
		}
	}

	private factorise(
		columns: Column[],
		size: number,
		own: Float64Array[],
		cross: Map<number, Float64Array>,
		eps: number
	): { factor: CholeskyDecomposition; eps: number } {
		const h = new Matrix(size, size);
		const data = (h as unknown as { data: Float64Array[] }).data;
		const count = this.operators.length;
		const addBlock = (rows: Member, columnsOf: Member, top: number, leftmost: number) => {
			const share = cosine(rows.direction, columnsOf.direction);
			if (share === 0) return;
			const block =
				rows.box === columnsOf.box
					? own[rows.box]
					: cross.get(Math.max(rows.box, columnsOf.box) * count + Math.min(rows.box, columnsOf.box));
			if (!block) return;
			const left = this.operators[rows.box];
			const right = this.operators[columnsOf.box];
			const transposed = rows.box < columnsOf.box;
			const columnIndex = Uint32Array.from(columnsOf.points, (p) => right.freeIndex[p]);
			for (let i = 0; i < rows.points.length; i++) {
				const line = data[top + i];
				const r = left.freeIndex[rows.points[i]];
				for (let j = 0; j < columnIndex.length; j++) {
					const c = columnIndex[j];
					line[leftmost + j] +=
						share * (transposed ? block[c * left.free.length + r] : block[r * right.free.length + c]);
				}
			}
		};
		for (const left of columns) {
			for (const right of columns) {
				for (const a of left.members) for (const b of right.members) addBlock(a, b, left.offset, right.offset);
			}
		}
		let trace = 0;
		for (let i = 0; i < size; i++) trace += data[i][i];
		const shift = (eps * trace) / size;
		for (let i = 0; i < size; i++) data[i][i] += shift;
		// Pairs are summed in different orders above and below the diagonal; the factorisation asks for the same bits.
		if (this.ties) for (let i = 0; i < size; i++) for (let j = 0; j < i; j++) data[j][i] = data[i][j];
		const factor = new CholeskyDecomposition(h);
		if (!(trace > 0) || !factor.isPositiveDefinite()) {
			const boxes = new Set(columns.flatMap(({ members }) => members.map((m) => this.operators[m.box].box)));
			const labels = [...boxes].map((box) => box.name ?? box.id);
			throw new MorphError(
				'metric-singular',
				`The vertices in design box ${labels.map((l) => `"${l}"`).join(', ')} do not determine its control points.`,
				'Use fewer control points, a larger smoothing length, a larger box, or a larger eps.',
				{ box: labels[0] }
			);
		}
		return { factor, eps: shift };
	}

	/** T' of lattice vectors (nPoints x 3 by box). */
	reduce(lattices: Float64Array[]): Reduced {
		return this.groups.map((group) => {
			const out = new Float64Array(group.size);
			for (const { members, offset } of group.columns) {
				for (const { box, direction, points } of members) {
					const lattice = lattices[box];
					for (let i = 0; i < points.length; i++) {
						const p = 3 * points[i];
						out[offset + i] +=
							direction[0] * lattice[p] + direction[1] * lattice[p + 1] + direction[2] * lattice[p + 2];
					}
				}
			}
			return out;
		});
	}

	/** T of a reduced vector: lattice displacements by box, nPoints x 3. */
	expand(reduced: Reduced): Float64Array[] {
		const lattices = this.operators.map((op) => new Float64Array(3 * op.pointCount));
		this.groups.forEach((group, g) => {
			for (const { members, offset } of group.columns) {
				for (const { box, direction, points } of members) {
					const lattice = lattices[box];
					for (let i = 0; i < points.length; i++) {
						const value = reduced[g][offset + i];
						for (let d = 0; d < 3; d++) lattice[3 * points[i] + d] += direction[d] * value;
					}
				}
			}
		});
		return lattices;
	}

	/** H^-1 of a reduced vector. */
	solve(right: Reduced): Reduced {
		return this.groups.map((group, g) =>
			Float64Array.from(group.factor.solve(Matrix.columnVector(right[g])).to1DArray())
		);
	}
}

export function dot(a: Reduced, b: Reduced): number {
	let sum = 0;
	for (let g = 0; g < a.length; g++) for (let i = 0; i < a[g].length; i++) sum += a[g][i] * b[g][i];
	return sum;
}

/** sum of factors[k] * vectors[k] */
export function combine(factors: number[], vectors: Reduced[]): Reduced {
	return vectors[0].map((_, g) => {
		const out = new Float64Array(vectors[0][g].length);
		for (let k = 0; k < vectors.length; k++) {
			const f = factors[k];
			if (f === 0) continue;
			const v = vectors[k][g];
			for (let i = 0; i < out.length; i++) out[i] += f * v[i];
		}
		return out;
	});
}
