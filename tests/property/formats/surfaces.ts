import fc from 'fast-check';
import { assemble } from '$lib/formats/assemble';
import type { WritableSurface } from '$lib/formats/writable';

/** float32 that a surface may have: finite, not -0 (positions never are). */
const coordinate = fc
	.oneof(
		{ weight: 4, arbitrary: fc.float({ min: -10, max: 10, noNaN: true }) },
		{
			weight: 1,
			arbitrary: fc.float({ noNaN: true, noDefaultInfinity: true, min: Math.fround(-3e38), max: Math.fround(3e38) })
		},
		{ weight: 2, arbitrary: fc.integer({ min: -5, max: 5 }) }
	)
	.map((x) => Math.fround(x) + 0);

const NAMES = ['', 'roof', 'left wing', 'größe Ä', 'a/b', 'x & <y> "z"', 'patch 7', '12'];

/** Any surface: polygons of 3 to 6 corners over a few vertices, runs of patches (names may come twice), some arrays. */
export const anySurface: fc.Arbitrary<WritableSurface> = fc
	.record({
		vertices: fc.array(fc.tuple(coordinate, coordinate, coordinate), { minLength: 3, maxLength: 12 }),
		cells: fc.array(
			fc.record({
				corners: fc.array(fc.nat({ max: 1000 }), { minLength: 3, maxLength: 6 }),
				patch: fc.nat({ max: 3 })
			}),
			{ minLength: 1, maxLength: 12 }
		),
		allTriangles: fc.boolean(),
		names: fc.shuffledSubarray(NAMES, { minLength: 4, maxLength: 4 }),
		seed: fc.integer({ min: 1, max: 1 << 30 })
	})
	.map(({ vertices, cells, allTriangles, names, seed }) => {
		const offsets = [0];
		const corners: number[] = [];
		const runs: { name: string; first: number }[] = [];
		cells.forEach((cell, c) => {
			if (c === 0 || names[cell.patch] !== runs[runs.length - 1].name) runs.push({ name: names[cell.patch], first: c });
			const used = allTriangles ? cell.corners.slice(0, 3) : cell.corners;
			used.forEach((corner) => corners.push(corner % vertices.length));
			offsets.push(corners.length);
		});
		const surface = assemble(
			{
				format: 'vtp',
				encoding: 'raw',
				positions: Float32Array.from(vertices.flat()),
				offsets: Uint32Array.from(offsets),
				corners: Uint32Array.from(corners),
				runs,
				arrays: [],
				notes: []
			},
			{}
		);
		let state = seed;
		const random = (n: number) =>
			Float64Array.from({ length: n }, () => {
				state = (Math.imul(state, 1103515245) + 12345) >>> 0;
				return state / 65536 - 20000;
			});
		return {
			positions: surface.positions,
			triangles: surface.triangles,
			polygons: surface.polygons,
			patches: surface.patches,
			arrays: [
				{ name: 'map', on: 'point', components: 1, values: random(vertices.length) },
				{ name: 'displacement', on: 'point', components: 3, values: random(3 * vertices.length) },
				{ name: 'quality', on: 'cell', components: 1, values: random(cells.length) }
			]
		};
	});
