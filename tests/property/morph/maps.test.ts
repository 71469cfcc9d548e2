import fc from 'fast-check';
import { Triangle, Vector3 } from 'three';
import { describe, expect, it } from 'vitest';
import {
	MorphError,
	displayDensity,
	makeSurface,
	mapTotal,
	matchMap,
	nodalGradient,
	readMapCsv,
	type MapKind,
	type MapLocation
} from '../../../src/lib/morph';
import { sequence } from '../../factories/numbers';
import { ellipsoid, type TestMesh } from '../../factories/surfaces';

const mesh = ellipsoid(2, [1.3, 0.9, 0.7]);
const surface = makeSurface(mesh.positions, mesh.triangles);
const vertices = mesh.positions.length / 3;
const faces = mesh.triangles.length / 3;
const filed = { positions: Float32Array.from(mesh.positions), triangles: mesh.triangles };
const KINDS: [MapKind, MapLocation][] = [
	['density', 'vertex'],
	['density', 'face'],
	['nodal', 'vertex'],
	['nodal', 'face'],
	['vector', 'vertex'],
	['vector', 'face']
];
const countOf = (kind: MapKind, location: MapLocation) =>
	(location === 'vertex' ? vertices : faces) * (kind === 'vector' ? 3 : 1);
const random = (count: number, seed: number) => {
	const next = sequence(seed);
	return Float64Array.from({ length: count }, next);
};

/** Area, normal and corners of each triangle by three.js: not the engine's sums. */
const byThree = ({ positions, triangles }: TestMesh) =>
	Array.from({ length: triangles.length / 3 }, (_, t) => {
		const ids = [0, 1, 2].map((k) => triangles[3 * t + k]);
		const [a, b, c] = ids.map((v) => new Vector3().fromArray(positions, 3 * v));
		const triangle = new Triangle(a, b, c);
		return { ids, area: triangle.getArea(), normal: triangle.getNormal(new Vector3()) };
	});

describe('nodal gradients', () => {
	// dJ = sum of s A (n . dx): for a displacement of the whole surface along one vector, face by face and by definition.
	it.each(KINDS)(
		'%s at %s: the change of the objective under a displacement is that of the definition',
		(kind, location) => {
			fc.assert(
				fc.property(fc.nat(), fc.boolean(), (seed, raises) => {
					const values = random(countOf(kind, location), seed);
					const displacement = random(3 * vertices, seed + 1);
					const outward = raises ? 'raises' : 'lowers';
					const gradient = nodalGradient({ kind, location, values, outward }, surface);
					const found = gradient.reduce((s, g, i) => s + g * displacement[i], 0);
					const triangles = byThree(mesh);
					const at = (v: number) => new Vector3().fromArray(displacement, 3 * v);
					// Vertex normals and masses from the triangles.
					const vertexNormal = Array.from({ length: vertices }, () => new Vector3());
					const mass = new Float64Array(vertices);
					for (const { ids, area, normal } of triangles) {
						for (const v of ids) {
							vertexNormal[v].addScaledVector(normal, area);
							mass[v] += area / 3;
						}
					}
					vertexNormal.forEach((n) => n.normalize());
					let wanted = 0;
					if (location === 'vertex') {
						for (let v = 0; v < vertices; v++) {
							if (kind === 'vector') wanted += at(v).dot(new Vector3().fromArray(values, 3 * v));
							else wanted += values[v] * (kind === 'density' ? mass[v] : 1) * at(v).dot(vertexNormal[v]);
						}
					} else {
						triangles.forEach(({ ids, area, normal }, t) => {
							const mean = new Vector3();
							for (const v of ids) mean.addScaledVector(at(v), 1 / 3);
							if (kind === 'vector') wanted += mean.dot(new Vector3().fromArray(values, 3 * t));
							else wanted += values[t] * (kind === 'density' ? area : 1) * mean.dot(normal);
						});
					}
					expect(found).toBeCloseTo(raises ? wanted : -wanted, 11);
					const total = mapTotal(gradient, surface);
					expect(total).toBeCloseTo(
						gradient.reduce((s, g, i) => s + g * vertexNormal[Math.floor(i / 3)].getComponent(i % 3), 0),
						11
					);
				}),
				{ numRuns: 20 }
			);
		}
	);

	it('a density of one has the volume as its objective: total A, gradient near dV/dx', () => {
		const gradient = nodalGradient(
			{ kind: 'density', location: 'face', values: new Float64Array(faces).fill(1), outward: 'raises' },
			surface
		);
		// A face's density is the volume that it sweeps: dV/dx of a closed surface is a third of the vector areas at each vertex.
		surface.volumeGradient.forEach((g, i) => expect(gradient[i]).toBeCloseTo(g, 12));
	});

	it('are shown as the density that they came from', () => {
		const values = random(vertices, 5);
		const gradient = nodalGradient({ kind: 'density', location: 'vertex', values, outward: 'raises' }, surface);
		displayDensity(gradient, surface).forEach((d, v) => expect(d).toBeCloseTo(values[v], 5));
	});
});

describe('matching', () => {
	const places = (location: MapLocation) =>
		location === 'vertex'
			? Float64Array.from(filed.positions)
			: Float64Array.from({ length: 3 * faces }, (_, i) => {
					const [t, d] = [Math.floor(i / 3), i % 3];
					return [0, 1, 2].reduce((s, k) => s + filed.positions[3 * filed.triangles[3 * t + k] + d] / 3, 0);
				});

	it.each(KINDS)(
		'%s at %s: finds its places in any order of rows, with the rounding of a text file',
		(kind, location) => {
			fc.assert(
				fc.property(fc.nat(), (seed) => {
					const next = sequence(seed);
					const components = kind === 'vector' ? 3 : 1;
					const count = countOf(kind, location) / components;
					const values = random(components * count, seed);
					const order = Array.from({ length: count }, (_, i) => i)
						.map((i) => [next(), i])
						.sort((a, b) => a[0] - b[0])
						.map(([, i]) => i);
					const at = places(location);
					const match = matchMap(
						{
							points: Float64Array.from(order.flatMap((i) => [0, 1, 2].map((d) => at[3 * i + d] + 4e-6 * next()))),
							values: Float64Array.from(
								order.flatMap((i) => Array.from(values.subarray(components * i, components * (i + 1))))
							),
							components
						},
						filed,
						{ kind, location }
					);
					match.values.forEach((v, i) => expect(v).toBeCloseTo(values[i], 14));
					expect(match).toMatchObject({ matched: count, exact: count, unmatched: 0, withoutValue: 0, kind, location });
					expect(match.coverage).toBeCloseTo(1, 12);
					expect(match.maxDistance).toBeLessThan(7e-6);
				}),
				{ numRuns: 10 }
			);
		}
	);

	it('keeps the total of derivatives and vectors given anywhere near the surface, and averages densities', () => {
		fc.assert(
			fc.property(fc.nat(), fc.integer({ min: 1, max: 300 }), (seed, rows) => {
				const next = sequence(seed);
				const points = new Float64Array(3 * rows);
				for (let r = 0; r < rows; r++) {
					const t = Math.floor((0.5 + 0.5 * next()) * (faces - 1));
					const [a, b] = [0.25 + 0.2 * next(), 0.25 + 0.2 * next()];
					for (let d = 0; d < 3; d++) {
						const corner = (k: number) => filed.positions[3 * filed.triangles[3 * t + k] + d];
						points[3 * r + d] = a * corner(0) + b * corner(1) + (1 - a - b) * corner(2) + 0.01 * next();
					}
				}
				const values = random(3 * rows, seed + 2);
				const vector = matchMap({ points, values, components: 3 }, filed, { kind: 'vector', location: 'vertex' });
				expect(vector.matched).toBe(rows);
				for (let d = 0; d < 3; d++) {
					const sum = (list: Float64Array) => list.reduce((s, v, i) => (i % 3 === d ? s + v : s), 0);
					expect(sum(vector.values)).toBeCloseTo(sum(values), 11);
				}
				const constant = matchMap({ points, values: new Float64Array(rows).fill(7), components: 1 }, filed, {
					kind: 'density',
					location: 'vertex'
				});
				// Each vertex has the constant or nothing.
				const reached = constant.values.filter((v) => v !== 0);
				reached.forEach((v) => expect(v).toBeCloseTo(7, 12));
				expect(constant.withoutValue).toBe(vertices - reached.length);
			}),
			{ numRuns: 30 }
		);
	});

	it('leaves rows beyond the limit out, and says which', () => {
		const points = Float64Array.from([...filed.positions.subarray(0, 9), 5, 5, 5, ...filed.positions.subarray(9, 12)]);
		const match = matchMap({ points, values: Float64Array.of(1, 2, 3, 4, 5), components: 1 }, filed, {
			kind: 'nodal',
			location: 'vertex'
		});
		expect(match).toMatchObject({ matched: 4, unmatched: 1, unmatchedRows: [4], withoutValue: vertices - 4 });
		expect(Array.from(match.values.subarray(0, 4))).toEqual([1, 2, 3, 5]);
		expect(match.coverage).toBeLessThan(0.1);
	});
});

describe('tables of points', () => {
	const bytes = (text: string) => new TextEncoder().encode(text);

	it('are read as they were written, by any separator and line end', () => {
		// -0 is written as 0.
		const number = fc.double({ noNaN: true, noDefaultInfinity: true }).map((x) => x + 0);
		fc.assert(
			fc.property(
				fc.array(fc.tuple(number, number, number, number), { minLength: 1, maxLength: 30 }),
				fc.constantFrom(',', ';', '\t', ' ', ' , '),
				fc.constantFrom('\n', '\r\n', '\r'),
				fc.boolean(),
				(rows, separator, end, header) => {
					const lines = [
						...(header ? [['x', 'y', 'z', 'sensitivity'].join(separator)] : []),
						...rows.map((row) => row.join(separator))
					];
					const table = readMapCsv(bytes(lines.join(end)));
					expect(table.rows).toBe(rows.length);
					rows.forEach((row, r) => {
						row.slice(0, 3).forEach((x, d) => expect(table.points[3 * r + d]).toBe(x));
						expect(table.values[r]).toBe(row[3]);
						expect(table.lines[r]).toBe(r + 1 + (header ? 1 : 0));
					});
				}
			)
		);
	});

	it('find their columns by name, in any order, and skip blank lines and remarks', () => {
		const table = readMapCsv(bytes('# from a solver\nid,gz,gy,gx,z,y,x\n\n7,6,5,4,3,2,1\n'));
		expect([Array.from(table.points), Array.from(table.values), table.components]).toEqual([[1, 2, 3], [4, 5, 6], 3]);
	});

	it('take a header with an unnamed column, as tables with row numbers have', () => {
		const table = readMapCsv(bytes(',x,y,z,value\n0,1,2,3,4\n'));
		expect([table.header, Array.from(table.points), Array.from(table.values)]).toEqual([
			['', 'x', 'y', 'z', 'value'],
			[1, 2, 3],
			[4]
		]);
	});

	const bad: [string, string, string, number | undefined][] = [
		['nothing', '', 'csv-empty', undefined],
		['remarks only', '# a\n# b\n', 'csv-empty', undefined],
		['a header only', 'x,y,z,sensitivity\n', 'csv-empty', undefined],
		['three columns', '1,2,3\n', 'csv-syntax', 1],
		['five columns', '1,2,3,4,5\n', 'csv-syntax', 1],
		['a short line', '1,2,3,4\n1,2,3\n', 'csv-syntax', 2],
		['a long line', '1,2,3,4\n1,2,3,4,5\n', 'csv-syntax', 2],
		['a word', '1,2,3,4\n1,2,three,4\n', 'csv-syntax', 2],
		['an empty field', 'x,y,z,sensitivity\n1,2,,4\n', 'csv-syntax', 2],
		['decimal commas', '1,5;2,5;3,5;4,5\n', 'csv-syntax', 1],
		['a fault in the first row', '1.0.0,2,3,4\n1,2,3,4\n', 'csv-syntax', 1],
		['a letter in the first row', 'O.1,2,3,4\n1,2,3,4\n', 'csv-syntax', 1],
		['a header without a value', 'x,y,z\n1,2,3\n', 'csv-syntax', 1],
		['nan', '1,2,3,4\n\n1,2,3,NaN\n', 'csv-non-finite', 3],
		['infinity', '1,2,inf,4\n', 'csv-non-finite', 1],
		['beyond float64', '1,2,3,1e999\n', 'csv-non-finite', 1]
	];
	it.each(bad)('refuse %s', (_, text, code, line) => {
		let error: unknown;
		try {
			readMapCsv(bytes(text));
		} catch (caught) {
			error = caught;
		}
		expect(error).toBeInstanceOf(MorphError);
		expect((error as MorphError).code).toBe(code);
		if (line !== undefined) expect((error as MorphError).place?.line).toBe(line);
	});
});
