import { Matrix, solve } from 'ml-matrix';
import { describe, expect, it } from 'vitest';
import {
	applyDisplacement,
	prepareMove,
	volumeOf,
	type DesignBox,
	type MoveConstraint,
	type MoveObjective,
	type Surface
} from '../../../src/lib/morph';
import { ellipsoid, makeBox, smoothGradient } from '../../unit/morph/shapes';

/** Binomial formula and its derivative: not the engine's recurrences. */
function polynomials(degree: number, t: number): { value: number[]; slope: number[] } {
	const choose = (n: number, k: number): number => (k === 0 ? 1 : (choose(n, k - 1) * (n - k + 1)) / k);
	const of = (n: number, i: number) => (i < 0 || i > n ? 0 : choose(n, i) * t ** i * (1 - t) ** (n - i));
	const all = Array.from({ length: degree + 1 }, (_, i) => i);
	return {
		value: all.map((i) => of(degree, i)),
		slope: all.map((i) => degree * (of(degree - 1, i - 1) - of(degree - 1, i)))
	};
}

/**
 * The move by one axis-aligned Bernstein box as the saddle-point system of Karush, Kuhn and Tucker, formed densely by the
 * definitions and solved by elimination with pivoting: no moments, no dual, no Cholesky factor.
 */
class Dense {
	readonly inside: number[] = [];
	/** Vertices inside x free points. */
	private readonly basis: Matrix;
	private readonly metric: Matrix;
	readonly points: number[];

	constructor(
		private readonly surface: Surface,
		box: DesignBox,
		smoothing: number,
		eps: number
	) {
		const { positions, mass, normals } = surface;
		const low = box.centre.map((c, d) => c - box.halfSize[d]);
		const local = (v: number) => [0, 1, 2].map((d) => (positions[3 * v + d] - low[d]) / (2 * box.halfSize[d]));
		for (let v = 0; v < mass.length; v++) if (local(v).every((u) => u >= 0 && u <= 1)) this.inside.push(v);
		const [nu, nv, nw] = box.lattice;
		this.points = [];
		for (let i = box.held.u0; i < nu - box.held.u1; i++) {
			for (let j = box.held.v0; j < nv - box.held.v1; j++) {
				for (let k = box.held.w0; k < nw - box.held.w1; k++) this.points.push((i * nv + j) * nw + k);
			}
		}
		const size = this.points.length;
		this.basis = new Matrix(this.inside.length, size);
		const h = new Matrix(size, size);
		this.inside.forEach((v, row) => {
			const by = local(v).map((u, d) => polynomials(box.lattice[d] - 1, u));
			const n = normals.subarray(3 * v, 3 * v + 3);
			const values = this.points.map((p) => {
				const [i, j, k] = [Math.floor(p / (nv * nw)), Math.floor(p / nw) % nv, p % nw];
				const slope = [
					(by[0].slope[i] * by[1].value[j] * by[2].value[k]) / (2 * box.halfSize[0]),
					(by[0].value[i] * by[1].slope[j] * by[2].value[k]) / (2 * box.halfSize[1]),
					(by[0].value[i] * by[1].value[j] * by[2].slope[k]) / (2 * box.halfSize[2])
				];
				const across = slope[0] * n[0] + slope[1] * n[1] + slope[2] * n[2];
				return {
					value: by[0].value[i] * by[1].value[j] * by[2].value[k],
					tangent: slope.map((s, d) => s - across * n[d])
				};
			});
			values.forEach((a, p) => {
				this.basis.set(row, p, a.value);
				values.forEach((b, q) => {
					const energy = a.tangent.reduce((s, x, d) => s + x * b.tangent[d], 0);
					h.set(p, q, h.get(p, q) + mass[v] * (a.value * b.value + smoothing * smoothing * energy));
				});
			});
		});
		const shift = (eps * h.trace()) / size;
		for (let p = 0; p < size; p++) h.set(p, p, h.get(p, p) + shift);
		this.metric = h;
	}

	/** B' of an N x 3 field, the three axes one after the other. */
	row(field: ArrayLike<number>): number[] {
		return [0, 1, 2].flatMap((d) =>
			this.basis
				.transpose()
				.mmul(Matrix.columnVector(this.inside.map((v) => field[3 * v + d])))
				.to1DArray()
		);
	}

	/** min f.q + 1/2 q'Hq with rows q = right; returns q and the multipliers. */
	saddle(f: number[], rows: number[][], right: number[]): { q: number[]; lambda: number[] } {
		const size = this.points.length;
		const n = 3 * size;
		const m = rows.length;
		const system = Matrix.zeros(n + m, n + m);
		for (let d = 0; d < 3; d++) system.setSubMatrix(this.metric, d * size, d * size);
		// Scaled rows, so that the pivots compare like with like.
		const scale = rows.map((row) => 1 / Math.hypot(...row));
		rows.forEach((row, i) => {
			row.forEach((c, k) => {
				system.set(n + i, k, scale[i] * c);
				system.set(k, n + i, scale[i] * c);
			});
		});
		const x = solve(
			system,
			Matrix.columnVector([...f.map((v) => -v), ...right.map((r, i) => r * scale[i])])
		).to1DArray();
		return { q: x.slice(0, n), lambda: x.slice(n).map((l, i) => -l * scale[i]) };
	}

	/** Displacement of the vertices inside, n x 3. */
	field(q: number[]): Float64Array {
		const size = this.points.length;
		const out = new Float64Array(3 * this.inside.length);
		for (let d = 0; d < 3; d++) {
			const part = this.basis.mmul(Matrix.columnVector(q.slice(d * size, (d + 1) * size))).to1DArray();
			part.forEach((x, i) => (out[3 * i + d] = x));
		}
		return out;
	}

	volume(displacement: Float64Array): number {
		const { positions, triangles, origin } = this.surface;
		return volumeOf(applyDisplacement(positions, Uint32Array.from(this.inside), displacement), triangles, origin);
	}
}

const longest = (field: Float64Array) => {
	let most = 0;
	for (let i = 0; i < field.length; i += 3) most = Math.max(most, Math.hypot(field[i], field[i + 1], field[i + 2]));
	return most;
};

describe('a move against the dense saddle-point system', () => {
	const surface = ellipsoid(4, [2.4, 0.9, 0.7]);
	const box = makeBox({
		centre: [1.3, 0, 0.1],
		halfSize: [1.2, 1, 0.9],
		lattice: [5, 4, 4],
		held: { u0: 2, u1: 0, v0: 0, v1: 0, w0: 0, w1: 0 }
	});
	const step = 0.02;
	const smoothing = 0.05;
	const gradient = smoothGradient(surface);
	const other = smoothGradient(surface, 5);
	const objectives: MoveObjective[] = [
		{ id: 'drag', gradient, sense: 'minimise', weight: 1 },
		{ id: 'lift', gradient: other, sense: 'hold', weight: 1 }
	];
	const dense = new Dense(surface, box, smoothing, 1e-6);
	const drag = dense.row(gradient);
	const lift = dense.row(other);
	const bulk = dense.row(surface.volumeGradient);
	const solve = (constraints: MoveConstraint[], path: 'direct' | 'moments' = 'direct') =>
		prepareMove(surface, [box], { smoothing, path }).solve({ objectives, step, constraints });
	const difference = (a: Float64Array, b: Float64Array) => a.reduce((m, x, i) => Math.max(m, Math.abs(x - b[i])), 0);

	it('moves the same vertices', () => {
		expect(Array.from(solve([]).moved)).toEqual(dense.inside);
	});

	it.each(['direct', 'moments'] as const)('with no constraint, %s: -H^-1 g, scaled to the step', (path) => {
		const move = solve([], path);
		const field = dense.field(dense.saddle(drag, [], []).q);
		const a = step / longest(field);
		expect(
			difference(
				move.displacement,
				field.map((x) => a * x)
			)
		).toBeLessThan(5e-8 * step);
		expect(move.stepFactor / a).toBeCloseTo(1, 7);
	});

	it('with an objective held: the same direction and price', () => {
		const move = solve([{ kind: 'objective', objectiveId: 'lift', bound: 'hold' }]);
		const { q, lambda } = dense.saddle(drag, [lift], [0]);
		const field = dense.field(q);
		const a = step / longest(field);
		expect(
			difference(
				move.displacement,
				field.map((x) => a * x)
			)
		).toBeLessThan(1e-8 * step);
		// Raising the held value by one unit changes the weighted objective by the multiplier; the price is the gain.
		expect(move.constraints[0].price / -lambda[0]).toBeCloseTo(1, 8);
	});

	it('with an objective bound to a change: the same move at the same length factor', () => {
		const held = solve([{ kind: 'objective', objectiveId: 'lift', bound: 'hold' }]);
		const value = 0.002;
		const move = solve([{ kind: 'objective', objectiveId: 'lift', bound: 'hold', value }]);
		const a = move.stepFactor;
		const { q } = dense.saddle(
			drag.map((x) => a * x),
			[lift],
			[value]
		);
		const field = dense.field(q);
		expect(difference(move.displacement, field)).toBeLessThan(1e-8 * step);
		expect(longest(field)).toBeCloseTo(step, 9);
		expect(a).not.toBeCloseTo(held.stepFactor, 6);
		expect(move.predicted[1].change).toBeCloseTo(value, 12);
	});

	it('with the volume and an objective held: the same move after the volume is restored', () => {
		const move = solve([
			{ kind: 'volume', bound: 'hold' },
			{ kind: 'objective', objectiveId: 'lift', bound: 'hold' }
		]);
		const { q, lambda } = dense.saddle(drag, [bulk, lift], [0, 0]);
		const field = dense.field(q);
		const a = step / longest(field);
		const first = field.map((x) => a * x);
		// The shortest correction that changes the volume and not the objective, as long as the curved surface needs it.
		const correction = dense.field(dense.saddle(new Array<number>(drag.length).fill(0), [bulk, lift], [1, 0]).q);
		let t = 0;
		for (let k = 0; k < 20; k++) {
			t -= dense.volume(first.map((x, i) => x + t * correction[i])) - surface.volume;
		}
		const wanted = first.map((x, i) => x + t * correction[i]);
		expect(Math.abs(dense.volume(wanted) / surface.volume - 1)).toBeLessThan(1e-13);
		expect(difference(first, wanted)).toBeGreaterThan(1e-5 * step);
		expect(difference(move.displacement, wanted)).toBeLessThan(1e-7 * step);
		expect(move.constraints[0].price / -lambda[0]).toBeCloseTo(1, 6);
		expect(move.constraints[1].price / -lambda[1]).toBeCloseTo(1, 6);
	});

	it('with an inequality: it binds where its multiplier has the right sign, else it is as if it were not there', () => {
		const free = solve([]);
		const rises = free.predicted[1].change > 0;
		const slack = solve([{ kind: 'objective', objectiveId: 'lift', bound: rises ? 'atLeast' : 'atMost' }]);
		expect(slack.constraints[0]).toMatchObject({ active: false, price: 0, kept: true });
		expect(difference(slack.displacement, free.displacement)).toBeLessThan(1e-14);
		const tight = solve([{ kind: 'objective', objectiveId: 'lift', bound: rises ? 'atMost' : 'atLeast' }]);
		const held = solve([{ kind: 'objective', objectiveId: 'lift', bound: 'hold' }]);
		expect(tight.constraints[0].active).toBe(true);
		expect(tight.constraints[0].price).toBeGreaterThan(0);
		expect(difference(tight.displacement, held.displacement)).toBeLessThan(1e-12);
	});
});
