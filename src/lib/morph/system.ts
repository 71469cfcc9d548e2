import { CholeskyDecomposition, Matrix } from 'ml-matrix';
import { boxDirections } from './box';
import { MorphError } from './errors';
import type { BoxOperator } from './operator';
import type { Checkpoint, Surface } from './types';

/** The free points of one box along one direction. */
interface Column {
	box: number;
	direction: [number, number, number];
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

const sameDirection = (a: [number, number, number], b: [number, number, number]) =>
	a[0] === b[0] && a[1] === b[1] && a[2] === b[2];

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

	constructor(
		private readonly operators: BoxOperator[],
		surface: Surface,
		smoothing: number,
		eps: number,
		checkpoint?: Checkpoint
	) {
		const count = operators.length;
		const own = operators.map((op, b) =>
			op.metric(surface, smoothing, checkpoint && ((f) => checkpoint((0.8 * (b + f)) / count)))
		);
		const cross = new Map<number, Float64Array>();
		const component = operators.map((_, b) => b);
		for (let a = 0; a < count; a++) {
			for (let b = 0; b < a; b++) {
				const both = intersect(operators[a].inside, operators[b].inside);
				if (both.length === 0) continue;
				cross.set(a * count + b, operators[a].crossMetric(operators[b], both, surface, smoothing));
				const from = component[a];
				const to = component[b];
				for (let c = 0; c < count; c++) if (component[c] === from) component[c] = to;
			}
		}
		checkpoint?.(0.85);
		for (const root of new Set(component)) {
			const members = operators.map((_, b) => b).filter((b) => component[b] === root);
			this.addComponent(members, own, cross, eps);
		}
		this.unknowns = this.groups.reduce((sum, g) => sum + g.size, 0);
		checkpoint?.(1);
	}

	private addComponent(members: number[], own: Float64Array[], cross: Map<number, Float64Array>, eps: number): void {
		let directions = members.map((b) => boxDirections(this.operators[b].box));
		// All three axes span the same space in any frame, so the world's serve.
		directions = directions.map((d) =>
			d.length === 3
				? [
						[1, 0, 0],
						[0, 1, 0],
						[0, 0, 1]
					]
				: d
		);
		const distinct: [number, number, number][] = [];
		for (const list of directions) {
			for (const d of list) if (!distinct.some((e) => sameDirection(d, e))) distinct.push(d);
		}
		const orthogonal = distinct.every((d, i) =>
			distinct.every((e, j) => i === j || Math.abs(d[0] * e[0] + d[1] * e[1] + d[2] * e[2]) < 1e-14)
		);
		const factors = new Map<string, { factor: CholeskyDecomposition; eps: number }>();
		const add = (columns: Column[], key: string | null) => {
			let size = 0;
			for (const column of columns) {
				column.offset = size;
				size += this.operators[column.box].free.length;
			}
			let made = key ? factors.get(key) : undefined;
			if (!made) {
				made = this.factorise(columns, size, own, cross, eps);
				if (key) factors.set(key, made);
			}
			this.groups.push({ columns, size, ...made });
		};
		if (orthogonal) {
			for (const direction of distinct) {
				const boxes = members.filter((_, i) => directions[i].some((d) => sameDirection(d, direction)));
				add(
					boxes.map((box) => ({ box, direction, offset: 0 })),
					boxes.join()
				);
			}
		} else {
			add(
				members.flatMap((box, i) => directions[i].map((direction) => ({ box, direction, offset: 0 }))),
				null
			);
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
		for (const left of columns) {
			for (const right of columns) {
				const cosine =
					left.direction[0] * right.direction[0] +
					left.direction[1] * right.direction[1] +
					left.direction[2] * right.direction[2];
				if (cosine === 0) continue;
				const n = this.operators[left.box].free.length;
				const m = this.operators[right.box].free.length;
				const block =
					left.box === right.box
						? own[left.box]
						: cross.get(Math.max(left.box, right.box) * count + Math.min(left.box, right.box));
				if (!block) continue;
				const transposed = left.box < right.box;
				for (let i = 0; i < n; i++) {
					const line = data[left.offset + i];
					for (let j = 0; j < m; j++)
						line[right.offset + j] = cosine * (transposed ? block[j * n + i] : block[i * m + j]);
				}
			}
		}
		let trace = 0;
		for (let i = 0; i < size; i++) trace += data[i][i];
		const shift = (eps * trace) / size;
		for (let i = 0; i < size; i++) data[i][i] += shift;
		const factor = new CholeskyDecomposition(h);
		if (!(trace > 0) || !factor.isPositiveDefinite()) {
			const labels = [...new Set(columns.map((c) => this.operators[c.box].box.name ?? this.operators[c.box].box.id))];
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
			for (const { box, direction, offset } of group.columns) {
				const lattice = lattices[box];
				const { free } = this.operators[box];
				for (let i = 0; i < free.length; i++) {
					const p = 3 * free[i];
					out[offset + i] = direction[0] * lattice[p] + direction[1] * lattice[p + 1] + direction[2] * lattice[p + 2];
				}
			}
			return out;
		});
	}

	/** T of a reduced vector: lattice displacements by box, nPoints x 3. */
	expand(reduced: Reduced): Float64Array[] {
		const lattices = this.operators.map((op) => new Float64Array(3 * op.pointCount));
		this.groups.forEach((group, g) => {
			for (const { box, direction, offset } of group.columns) {
				const { free } = this.operators[box];
				const lattice = lattices[box];
				for (let i = 0; i < free.length; i++) {
					const value = reduced[g][offset + i];
					for (let d = 0; d < 3; d++) lattice[3 * free[i] + d] += direction[d] * value;
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
