import { describe, expect, it } from 'vitest';
import { makeSurface, prepareThickness, type MorphError } from '$lib/morph';
import { cube, icosphere } from './shapes';

const all = (n: number) => Uint32Array.from({ length: n }, (_, v) => v);

/** A box of these edges, each face split into k x k. */
function slab(k: number, edges: [number, number, number]) {
	const { positions, triangles } = cube(k);
	return makeSurface(
		positions.map((x, i) => x * edges[i % 3]),
		triangles
	);
}

/** Two spheres about the origin, the inner one turned inside out. */
function shell(level: number, outer: number, inner: number) {
	const { positions, triangles } = icosphere(level);
	const n = positions.length / 3;
	return makeSurface(
		Float64Array.from([...positions.map((x) => outer * x), ...positions.map((x) => inner * x)]),
		Uint32Array.from([
			...triangles,
			...triangles.map((_, i) => n + triangles[i % 3 === 0 ? i : i % 3 === 1 ? i + 1 : i - 1])
		])
	);
}

describe('wall thickness', () => {
	it('a slab: exactly its height wherever the normal is straight', () => {
		const surface = slab(6, [3, 2, 0.125]);
		const inner = all(surface.mass.length).filter((v) => Math.abs(surface.normals[3 * v + 2]) === 1);
		const t = prepareThickness(surface, 0.1).thickness(surface.positions, inner);
		expect(inner.length).toBe(50);
		for (const x of t) expect(x).toBeCloseTo(0.125, 14);
	});

	it('a box: across each pair of faces', () => {
		const surface = slab(4, [1, 2, 3]);
		const t = prepareThickness(surface, 0.1).thickness(surface.positions, all(surface.mass.length));
		for (let v = 0; v < t.length; v++) {
			for (let d = 0; d < 3; d++) if (Math.abs(surface.normals[3 * v + d]) === 1) expect(t[v]).toBeCloseTo(d + 1, 13);
		}
	});

	it('nothing within reach is Infinity', () => {
		const surface = slab(2, [1, 1, 1]);
		const t = prepareThickness(surface, 0.1).thickness(surface.positions, all(surface.mass.length), 0.2);
		expect([...t].every((x) => x === Infinity)).toBe(true);
	});

	it('rows: slack to first order with the hit triangle’s corners, on the nose for a moved opposite wall', () => {
		const surface = slab(4, [1, 1, 0.2]);
		const top = all(surface.mass.length).filter((v) => surface.normals[3 * v + 2] === 1);
		const constraint = prepareThickness(surface, 0.15).place(top);
		const rows = constraint.rows(surface.positions, 0.1);
		expect(rows.count).toBe(top.length);
		for (let i = 0; i < rows.count; i++) {
			expect(rows.starts[i + 1] - rows.starts[i]).toBe(4);
			expect(rows.values[i]).toBeCloseTo(0.2, 14);
			expect(rows.slack[i]).toBeCloseTo(0.05, 14);
			// The whole moved as one changes nothing.
			for (let d = 0; d < 3; d++) {
				let sum = 0;
				for (let t = rows.starts[i]; t < rows.starts[i + 1]; t++) sum += rows.vectors[3 * t + d];
				expect(sum).toBeCloseTo(0, 14);
			}
		}
		// The lower face raised by 0.03.
		const moved = surface.positions.map((x, i) => (i % 3 === 2 && x === 0 ? 0.03 : x));
		const after = constraint.rows(moved, 0.1);
		for (let i = 0; i < after.count; i++) expect(after.values[i]).toBeCloseTo(0.17, 14);
	});

	it('rows: the change of a shell whose spheres are scaled is what they say', () => {
		const surface = shell(2, 1, 0.9);
		const n = surface.mass.length / 2;
		const constraint = prepareThickness(surface, 0.02).place(all(n));
		const before = constraint.rows(surface.positions, 1);
		// Each sphere is scaled about the centre: normals stay, opposite triangles turn only with their sphere.
		const move = surface.positions.map((x, i) => (i < 3 * n ? -0.4 * x : 0.3 * x));
		const error = (h: number) => {
			const after = constraint.rows(
				surface.positions.map((x, i) => x + h * move[i]),
				1
			);
			let worst = 0;
			for (let i = 0; i < before.count; i++) {
				let first = 0;
				for (let t = before.starts[i]; t < before.starts[i + 1]; t++)
					for (let d = 0; d < 3; d++) first += before.vectors[3 * t + d] * move[3 * before.vertices[t] + d];
				expect(after.vertices[after.starts[i]]).toBe(before.vertices[before.starts[i]]);
				worst = Math.max(worst, Math.abs(after.values[i] - before.values[i] - h * first));
			}
			return worst;
		};
		expect(before.count).toBe(n);
		// Radial scaling keeps every ray on its line and every triangle parallel to itself: linear to roundoff.
		expect(error(1e-2)).toBeLessThan(1e-12);
	});

	it('a wall pushed through its opposite wall has a negative thickness', () => {
		const surface = slab(4, [1, 1, 0.01]);
		const top = all(surface.mass.length).filter((v) => surface.normals[3 * v + 2] === 1);
		const constraint = prepareThickness(surface, 0.005).place(top);
		const chosen = new Set(top);
		const moved = surface.positions.map((x, i) => (i % 3 === 2 && chosen.has((i - 2) / 3) ? x - 0.03 : x));
		const rows = constraint.rows(moved, 0.001);
		expect(rows.count).toBeGreaterThan(0);
		for (let i = 0; i < rows.count; i++) expect(rows.values[i]).toBeCloseTo(-0.02, 3);
	});

	it('a place thinner than the limit before the move must hold its thickness, or reach the limit when asked to', () => {
		const surface = slab(4, [1, 1, 0.1]);
		const top = all(surface.mass.length).filter((v) => surface.normals[3 * v + 2] === 1);
		const hold = prepareThickness(surface, 0.3).place(top).rows(surface.positions, 0.01);
		const thicken = prepareThickness(surface, 0.3, { thin: 'thicken' }).place(top).rows(surface.positions, 0.01);
		expect(hold.count).toBe(top.length);
		for (let i = 0; i < hold.count; i++) {
			expect(hold.slack[i]).toBe(0);
			expect(thicken.slack[i]).toBeCloseTo(-0.2, 14);
		}
	});

	it('refuses a thickness that is none', () => {
		const surface = slab(1, [1, 1, 1]);
		for (const least of [0, -1, NaN]) {
			expect(() => prepareThickness(surface, least)).toThrow(
				expect.objectContaining({ code: 'thickness-invalid' } satisfies Partial<MorphError>)
			);
		}
	});
});
