import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { readStl, weldTriangles, writeStl, type Mesh } from '$lib/morph';

/** Finite float32 of every size, with many equal ones. */
const coordinate = fc.oneof(
	fc.float({ noNaN: true, noDefaultInfinity: true }),
	fc.constantFrom(0, -0, 1, -1, 0.1, 1e-38, 3e38).map(Math.fround)
);
const soup = fc
	.integer({ min: 1, max: 30 })
	.chain((n) => fc.array(coordinate, { minLength: 9 * n, maxLength: 9 * n }))
	.map((c) => Float32Array.from(c));
const name = fc.string({ maxLength: 120, unit: 'grapheme' }).map((s) => s.replace(/\s+/g, ' ').trim());

/** Welding as one would write it without care for time. */
function bruteWeld(corners: Float32Array) {
	const vertices: number[][] = [];
	const triangles: number[] = [];
	for (let i = 0; i < corners.length; i += 3) {
		const p = [corners[i], corners[i + 1], corners[i + 2]];
		let v = vertices.findIndex((q) => q[0] === p[0] && q[1] === p[1] && q[2] === p[2]);
		if (v < 0) v = vertices.push(p) - 1;
		triangles.push(v);
	}
	return { vertices, triangles };
}

const cornersOf = (mesh: Pick<Mesh, 'positions' | 'triangles'>) =>
	Float32Array.from(Array.from(mesh.triangles).flatMap((v) => Array.from(mesh.positions.subarray(3 * v, 3 * v + 3))));

describe('STL properties', () => {
	it('welding equals brute force', () => {
		fc.assert(
			fc.property(soup, (corners) => {
				const fast = weldTriangles(corners);
				const slow = bruteWeld(corners);
				expect(Array.from(fast.triangles)).toEqual(slow.triangles);
				expect(Array.from(fast.positions)).toEqual(slow.vertices.flat().map((x) => x + 0));
			})
		);
	});

	it('reads back what it wrote: bits, order and patches, in both encodings', () => {
		fc.assert(
			fc.property(
				soup,
				fc.array(name, { minLength: 1, maxLength: 4 }),
				fc.constantFrom('binary', 'ascii'),
				(corners, names, encoding) => {
					const welded = weldTriangles(corners);
					const count = welded.triangles.length / 3;
					const cuts = names.map((_, i) => Math.floor((i * count) / names.length));
					const patches = names.map((n, i) => ({
						name: n,
						firstTriangle: cuts[i],
						triangleCount: (cuts[i + 1] ?? count) - cuts[i]
					}));
					const mesh = readStl(writeStl({ ...welded, patches }, { encoding: encoding as 'binary' | 'ascii' }));
					expect(cornersOf(mesh)).toEqual(cornersOf(welded));
					expect(mesh.triangles).toEqual(welded.triangles);
					expect(mesh.patches.map((p) => p.triangleCount)).toEqual(patches.map((p) => p.triangleCount));
					if (encoding === 'ascii') expect(mesh.patches).toEqual(patches);
				}
			)
		);
	});
});
