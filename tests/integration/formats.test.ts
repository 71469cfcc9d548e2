/** Surfaces in every format come in as shapes; what goes out is the same surface. */
import { gzipSync } from 'node:zlib';
import JSZip from 'jszip';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { objChunks } from '$lib/formats/obj-write';
import { plyChunks } from '$lib/formats/ply-write';
import { readSurface } from '$lib/formats/read';
import { vtpChunks } from '$lib/formats/vtp-write';
import { joined } from '$lib/formats/writable';
import { newScene, upload, type Scene } from '../factories/scene';
import { readSoup, soupArea, soupOf, soupVolume, writeBinarySoup } from '../factories/stl';
import { csvOf, ellipsoid } from '../factories/surfaces';
import { startServer, type TestServer } from '../harness/server';

let server: TestServer;
let scene: Scene;
beforeAll(async () => {
	server = await startServer();
	scene = await newScene(server, 'm');
});
afterAll(() => server.stop());

const mesh = ellipsoid(2, [2, 1, 1]);
const soup = soupOf(mesh.positions, mesh.triangles);
const half = mesh.triangles.length / 6;
const surface = {
	positions: Float32Array.from(mesh.positions),
	triangles: mesh.triangles,
	patches: [
		{ name: 'front', firstTriangle: 0, triangleCount: half },
		{ name: 'rear', firstTriangle: half, triangleCount: half }
	]
};
const bytes = (chunks: Iterable<Uint8Array>) => Uint8Array.from(joined(chunks));
const zipped = async () => {
	const zip = new JSZip();
	zip.file('part.obj', bytes(objChunks(surface)));
	return Uint8Array.from(await zip.generateAsync({ type: 'uint8array' }));
};

/** A unit cube of quadrilaterals, written by hand after the format's published description (Wavefront OBJ). */
const CUBE = `# a cube
v 0 0 0
v 1 0 0
v 1 1 0
v 0 1 0
v 0 0 1
v 1 0 1
v 1 1 1
v 0 1 1
g floor
f 1 4 3 2
g walls
f 1 2 6 5
f 2 3 7 6
f 3 4 8 7
f 4 1 5 8
g roof
f 5 6 7 8
`;

describe('surfaces in', () => {
	it.each<[string, () => Uint8Array<ArrayBuffer> | Promise<Uint8Array<ArrayBuffer>>]>([
		['part.obj', () => bytes(objChunks(surface))],
		['part.ply', () => bytes(plyChunks(surface))],
		['part.vtp', () => bytes(vtpChunks(surface))],
		['part.stl.gz', () => Uint8Array.from(gzipSync(writeBinarySoup(soup)))],
		['part.zip', zipped]
	])('%s is the surface that was written', async (filename, file) => {
		const shape = await scene.importShape(await file(), filename);
		expect(shape).toMatchObject({ closed: true, triangleCount: mesh.triangles.length / 3, filename });
		expect(shape.vertexCount).toBe(mesh.positions.length / 3);
		expect(shape.volume! / soupVolume(soup)).toBeCloseTo(1, 9);
		expect(shape.area / soupArea(soup)).toBeCloseTo(1, 9);
		if (!filename.includes('stl')) expect(shape.patches.map((p) => p.name)).toEqual(['front', 'rear']);
		expect(readSoup(await scene.file(shape.id)).corners).toEqual(soup.corners);
	});

	it('polygons become triangles, groups become patches', async () => {
		const cube = await scene.importShape(CUBE, 'cube.obj');
		expect(cube).toMatchObject({ vertexCount: 8, triangleCount: 12, closed: true, area: 6, volume: 1, name: 'cube' });
		expect(cube.patches.map((p) => [p.name, p.triangleCount])).toEqual([
			['floor', 2],
			['walls', 8],
			['roof', 2]
		]);
	});

	it('what is broken is refused with file and line, and nothing is kept', async () => {
		const path = `/api/studies/${scene.study.id}/shapes?filename=torn.obj`;
		const job = await upload(server, scene.token, path, CUBE.replace('f 5 6 7 8', 'f 5 6 7 99'));
		expect(job).toMatchObject({ state: 'failed', error: { code: 'bad-file' } });
		expect(job.error?.detail).toMatch(/torn\.obj.*[Ll]ine 18/);
	});
});

describe('files out', () => {
	it('are the shape again, triangle by triangle, with its patches and how it moved', async () => {
		const study = await newScene(server, 'm');
		const parent = await study.importShape(bytes(plyChunks(surface)), 'part.ply');
		await study.importMap(
			parent.id,
			csvOf(soup, (x) => x)
		);
		const box = await study.addBox({ centre: [1, 0, 0], halfSize: [1.2, 1.2, 1.2] });
		const { shapeId } = await study.move(parent.id, { boxIds: [box.id], step: 0.01 });
		const child = await study.soup(shapeId);
		for (const format of ['obj', 'ply', 'vtp'] as const) {
			const read = await readSurface(await study.file(shapeId, format), `child.${format}`);
			expect(soupOf(read.positions, read.triangles).corners).toEqual(child.corners);
			expect(read.patches.map((p) => [p.name, p.triangleCount])).toEqual([
				['front', half],
				['rear', half]
			]);
			if (format === 'obj') continue;
			const moved = read.arrays.filter((a) => a.on === 'point' && a.name.startsWith('displacement'));
			const largest = moved.reduce((max, a) => a.values.reduce((m, x) => Math.max(m, Math.abs(x)), max), 0);
			expect(largest).toBeGreaterThan(0.005);
			expect(largest).toBeLessThan(0.0101);
		}
	});
});
