import { describe, expect, it } from 'vitest';
import {
	latticeMotion,
	makeSurface,
	nodalGradient,
	prepareMove,
	type DesignBox,
	type Surface
} from '../../../src/lib/morph';
import { BoxOperator } from '../../../src/lib/morph/operator';
import { revolve } from '../../factories/revolution';
import { ellipsoid, type TestMesh } from '../../factories/surfaces';
import { makeBox } from '../../unit/morph/shapes';

const AXES = [2.4, 0.9, 0.7] as const;
const STEP = 0.01;
const density = (x: number, y: number, z: number) => Math.cos(3 * x) * Math.sin(2 * y + 0.4) + 0.3 * z;

/** An ellipsoid of rings that crowd towards one end: edges along it differ tenfold and more. */
function crowded(rings: number, sectors: number): TestMesh {
	const profile = Array.from({ length: rings + 1 }, (_, k): [number, number] => {
		const t = Math.PI * (k / rings) ** 0.5;
		return [-Math.cos(t), k === 0 || k === rings ? 0 : Math.sin(t)];
	});
	const mesh = revolve(profile, sectors);
	return { ...mesh, positions: mesh.positions.map((x, i) => x * AXES[i % 3]) };
}

const boxOf = (points: number): DesignBox =>
	makeBox({
		centre: [1.3, 0, 0.1],
		halfSize: [1.2, 1, 0.9],
		lattice: [points, points, points],
		held: { u0: 2, u1: 0, v0: 0, v1: 0, w0: 0, w1: 0 }
	});
const surfaceOf = ({ positions, triangles }: TestMesh) => makeSurface(positions, triangles);
const gradientOf = (surface: Surface) => {
	const values = Float64Array.from(surface.mass, (_, v) =>
		density(surface.positions[3 * v], surface.positions[3 * v + 1], surface.positions[3 * v + 2])
	);
	return nodalGradient({ kind: 'density', location: 'vertex', values, outward: 'raises' }, surface);
};
const probes = ellipsoid(4, AXES).positions;
const scaled = (field: Float64Array) => {
	let most = 0;
	for (let i = 0; i < field.length; i += 3) most = Math.max(most, Math.hypot(field[i], field[i + 1], field[i + 2]));
	return field.map((x) => (STEP * x) / most);
};
const difference = (a: Float64Array, b: Float64Array) => {
	let above = 0;
	let below = 0;
	a.forEach((x, i) => {
		above += (x - b[i]) ** 2;
		below += x * x;
	});
	return Math.sqrt(above / below);
};

/** The product's move, seen at the probes. */
function move(mesh: TestMesh, points: number, smoothing: number): Float64Array {
	const surface = surfaceOf(mesh);
	const box = boxOf(points);
	const { lattices } = prepareMove(surface, [box], { smoothing }).solve({
		objectives: [{ id: 'one', gradient: gradientOf(surface), sense: 'minimise', weight: 1 }],
		step: STEP,
		constraints: []
	});
	return scaled(latticeMotion(probes, box).displace(lattices[0]));
}

/** Control points along the raw gradient, B'g. */
function rawLattice(mesh: TestMesh, points: number): Float64Array {
	const surface = surfaceOf(mesh);
	const box = boxOf(points);
	const lattice = new BoxOperator(box, surface, undefined, 'direct').project(gradientOf(surface)).map((x) => -x);
	// Two planes are held.
	lattice.fill(0, 0, 3 * 2 * points * points);
	return scaled(latticeMotion(probes, box).displace(lattice));
}

/** Vertices along the raw gradient: at each probe, that of the nearest vertex. */
function rawVertices(mesh: TestMesh): Float64Array {
	const surface = surfaceOf(mesh);
	const gradient = gradientOf(surface);
	const { inside } = latticeMotion(probes, boxOf(4));
	const { positions } = surface;
	return scaled(
		Float64Array.from(
			Array.from(inside).flatMap((p) => {
				let best = 0;
				let least = Infinity;
				for (let v = 0; v < positions.length; v += 3) {
					const d = [0, 1, 2].reduce((s, k) => s + (positions[v + k] - probes[3 * p + k]) ** 2, 0);
					if (d < least) [least, best] = [d, v];
				}
				return Array.from(gradient.subarray(best, best + 3), (x) => -x);
			})
		)
	);
}

/**
 * A Sobolev gradient belongs to the surface, a raw one to its discretisation (Jameson, Mohammadi and Pironneau on smoothed
 * gradients in shape design). Figures: relative difference in the mean square over probes.
 */
describe('independence of mesh and lattice', () => {
	const coarse = ellipsoid(4, AXES);
	const fine = ellipsoid(5, AXES);
	const uneven = crowded(80, 64);

	it('three meshes: the move differs by less than 2 %, the raw gradient by more than 25 %', () => {
		const [a, b, c] = [fine, coarse, uneven].map((mesh) => move(mesh, 6, 0.2));
		expect(difference(a, b)).toBeLessThan(0.02);
		expect(difference(a, c)).toBeLessThan(0.02);
		const [raw, rawUneven] = [fine, uneven].map(rawVertices);
		expect(difference(raw, rawUneven)).toBeGreaterThan(0.25);
	});

	it('three lattices: the move differs by less than 3 %, the raw gradient by eight times as much and more', () => {
		const [a, b, c] = [8, 7, 6].map((points) => move(fine, points, 0.4));
		const [rawA, rawB, rawC] = [8, 7, 6].map((points) => rawLattice(fine, points));
		expect(difference(a, b)).toBeLessThan(0.015);
		expect(difference(a, c)).toBeLessThan(0.03);
		expect(difference(rawA, rawB) / difference(a, b)).toBeGreaterThan(8);
		expect(difference(rawA, rawC) / difference(a, c)).toBeGreaterThan(8);
	});
});
