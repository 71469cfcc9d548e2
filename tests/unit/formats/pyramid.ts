import type { WritableSurface } from '$lib/formats/writable';

/** A closed pyramid over a square of side 2, height 1.5: a quad and four triangles, two patches, arrays of each kind. */
export function pyramid(): WritableSurface {
	return {
		positions: Float32Array.from([0, 0, 0, 2, 0, 0, 2, 2, 0, 0, 2, 0, 1, 1, 1.5]),
		triangles: Uint32Array.from([0, 3, 2, 0, 2, 1, 0, 1, 4, 1, 2, 4, 2, 3, 4, 3, 0, 4]),
		polygons: {
			offsets: Uint32Array.from([0, 4, 7, 10, 13, 16]),
			corners: Uint32Array.from([0, 3, 2, 1, 0, 1, 4, 1, 2, 4, 2, 3, 4, 3, 0, 4])
		},
		patches: [
			{ name: 'floor', firstTriangle: 0, triangleCount: 2 },
			{ name: 'sides', firstTriangle: 2, triangleCount: 4 }
		],
		arrays: [
			{ name: 'map', on: 'point', components: 1, values: Float64Array.from([0.5, -1, 2, 0.25, 7]) },
			{ name: 'displacement', on: 'point', components: 3, values: Float64Array.from({ length: 15 }, (_, i) => i / 8) },
			{ name: 'quality', on: 'cell', components: 1, values: Float64Array.from([1, 2, 3, 4, 5]) }
		]
	};
}
