/**
 * Real data: Debian's package openscad-testing-data (import.stl in ASCII, import_bin.stl in binary, import_bin_solid.stl in binary
 * with a header that begins with "solid"): one solid of 46 facets that no one here made, closed, of area 10.48931522 and volume
 * 2.87107366 (both measured outside this project).
 */
import { readFileSync } from 'node:fs';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { newScene } from '../factories/scene';
import { readSoup, soupVolume } from '../factories/stl';
import { csvOf, predictedChange } from '../factories/surfaces';
import { foreignMesh } from '../harness/foreign-meshes';
import { startServer, type TestServer } from '../harness/server';

let server: TestServer;
beforeAll(async () => {
	server = await startServer();
});
afterAll(() => server.stop());

const field = (x: number, y: number, z: number) => 1 + x - 0.5 * y + 0.3 * z * z;

describe.each(['import.stl', 'import_bin.stl', 'import_bin_solid.stl'] as const)('%s', (name) => {
	it('goes from upload through map, box and move to the next STL', async () => {
		const bytes = new Uint8Array(readFileSync(foreignMesh(name)));
		const scene = await newScene(server, 'm');
		const shape = await scene.importShape(bytes, name);
		expect(shape).toMatchObject({ triangleCount: 46, closed: true, filename: name });
		// Euler: 46 facets of a closed surface without handles have 25 vertices.
		expect(shape.vertexCount).toBe(25);
		// The files print six decimals.
		expect(shape.area).toBeCloseTo(10.48931522, 5);
		expect(shape.volume).toBeCloseTo(2.87107366, 5);
		expect(Buffer.from(await scene.file(shape.id, 'original')).equals(bytes)).toBe(true);

		const soup = readSoup(bytes);
		await scene.importMap(shape.id, csvOf(soup, field));
		const { min, max } = shape.bounds;
		const size = max.map((value, c) => value - min[c]);
		// The upper half of the body, open to the outside on the other faces.
		const box = await scene.addBox({
			centre: [(min[0] + max[0]) / 2, (min[1] + max[1]) / 2, max[2] - size[2] / 4 + 0.05],
			halfSize: [size[0], size[1], size[2] / 4 + 0.05],
			lattice: [3, 3, 4],
			held: { u0: 0, u1: 0, v0: 0, v1: 0, w0: 1, w1: 0 }
		});
		const move = await scene.move(shape.id, { boxIds: [box.id], step: 0.02, smoothing: 0.1 });
		const child = await scene.soup(move.shapeId, name === 'import.stl' ? 'ascii' : 'binary');
		expect(child.corners).toHaveLength(9 * 46);
		expect(Math.abs(soupVolume(child) / soupVolume(soup) - 1)).toBeLessThan(5e-8);
		expect(move.maxDisplacement).toBeGreaterThan(0.018);
		expect(move.maxDisplacement).toBeLessThan(0.022);
		const lower = box.centre[2] - box.halfSize[2];
		let below = 0;
		for (let at = 0; at < soup.corners.length; at += 3) {
			if (soup.corners[at + 2] >= lower) continue;
			below++;
			const same = [0, 1, 2].every((c) => Object.is(child.corners[at + c] + 0, soup.corners[at + c] + 0));
			expect(same).toBe(true);
		}
		expect(below).toBeGreaterThan(0);
		expect(move.predicted[0].change! / predictedChange(soup, child, 1, field)).toBeCloseTo(1, 4);
	});
});
