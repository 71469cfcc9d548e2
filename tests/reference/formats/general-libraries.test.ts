/**
 * Against general libraries: Debian's VTK 9.1 (python3-vtk9), meshio (python3-meshio) and ADMesh (admesh). They write here
 * and we read; we write and they read. vtk_files.py beside this file is their side.
 */
import { execFileSync } from 'node:child_process';
import { readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { beforeAll, describe, expect, it } from 'vitest';
import { writeStl, type MorphError } from '$lib/morph';
import { writeObj } from '$lib/formats/obj-write';
import { writePly } from '$lib/formats/ply-write';
import { parseSurface } from '$lib/formats/read';
import { writeVtp } from '$lib/formats/vtp-write';
import type { WritableSurface } from '$lib/formats/writable';
import { debianFile, temporaryFolder, vtkFiles, weldedMeasures } from './foreign-files';

interface ArrayFigures {
	name: string;
	on: 'point' | 'cell';
	components: number;
	tuples: number;
	sum: number;
	first: number[];
	last: number[];
}

interface Figures {
	points: number;
	polys: number;
	strips: number;
	triangles: number;
	area: number;
	volume: number;
	arrays: ArrayFigures[];
	refused?: string;
}

interface Read extends Figures {
	positions: number[];
	connectivity: number[];
	fields: Record<string, unknown[]>;
	meshio?: { points: number; cells: number; arrays: Record<string, number> };
}

let folder: string;
let manifest: Record<string, Figures>;

beforeAll(() => {
	folder = temporaryFolder();
	vtkFiles('write', folder);
	manifest = JSON.parse(readFileSync(join(folder, 'manifest.json'), 'utf8')) as Record<string, Figures>;
}, 300_000);

describe('what they write, we read', () => {
	it('in every format and encoding, with its arrays', () => {
		const names = Object.keys(manifest);
		expect(names.length).toBeGreaterThan(60);
		for (const name of names) {
			const expected = manifest[name];
			const bytes = new Uint8Array(readFileSync(join(folder, name)));
			if (expected.refused) {
				let code = '';
				try {
					parseSurface(bytes, name);
				} catch (thrown) {
					code = (thrown as MorphError).code;
				}
				expect(code, name).toBe(expected.refused);
				continue;
			}
			const surface = parseSurface(bytes, name);
			const measures = weldedMeasures(surface);
			expect(surface.triangles.length / 3, name).toBe(expected.triangles);
			if (surface.format !== 'stl') expect(surface.positions.length / 3, name).toBe(expected.points);
			expect(measures.closed, name).toBe(true);
			// ASCII writers print six digits, here and in VTK's own figures of the model in memory.
			expect(measures.area / expected.area, name).toBeCloseTo(1, 4);
			expect(measures.volume / expected.volume, name).toBeCloseTo(1, 4);
			for (const array of expected.arrays) {
				const ours = surface.arrays.find((a) => a.name === array.name && a.on === array.on);
				expect(ours?.components, `${name} ${array.name}`).toBe(array.components);
				// Vertices and lines come before the polygons, and strips are cut into triangles.
				if (array.on === 'cell' && (name.startsWith('ell') || name.startsWith('strips'))) continue;
				const values = ours!.values;
				expect(values.length, `${name} ${array.name}`).toBe(array.tuples * array.components);
				const near = (a: number, b: number) =>
					expect(Math.abs(a - b), `${name} ${array.name}`).toBeLessThan(1e-5 * (1 + Math.abs(b)));
				array.first.forEach((value, c) => near(values[c], value));
				array.last.forEach((value, c) => near(values[values.length - array.components + c], value));
				near(values.reduce((sum, value) => sum + value, 0) / values.length, array.sum / values.length);
			}
		}
	});

	it('values of polygons stay theirs behind vertices and lines, and of strips go to their triangles', () => {
		for (const name of Object.keys(manifest)) {
			if (!name.startsWith('ell') && !name.startsWith('strips')) continue;
			const surface = parseSurface(new Uint8Array(readFileSync(join(folder, name))), name);
			if (name.startsWith('ell')) {
				// Ten cells, three values in order; the first two belong to the vertex and the line.
				const region = surface.arrays.find((a) => a.name === 'region')!;
				expect([...region.values], name).toEqual([2, 3, 4, 5, 6, 7, 8, 9].map((k) => Math.floor((3 * k) / 10)));
				expect(surface.polygons!.offsets.length - 1, name).toBe(8);
			} else {
				const number = surface.arrays.find((a) => a.name === 'strip number')!;
				expect(number.values, name).toHaveLength(surface.triangles.length / 3);
				// Ascending from 0 to the last strip without a gap.
				expect(Math.max(...number.values), name).toBe(manifest[name].strips - 1);
				expect(
					number.values.every((v, k) => k === 0 || v === number.values[k - 1] || v === number.values[k - 1] + 1)
				).toBe(true);
			}
		}
	});
});

describe('what we write, they read', () => {
	/** An L-shaped prism of polygons with two patches and arrays. */
	function prism(): WritableSurface {
		const surface = parseSurface(new Uint8Array(readFileSync(join(folder, 'ell-appended.vtp'))), 'ell.vtp');
		const points = surface.positions.length / 3;
		return {
			positions: surface.positions,
			triangles: surface.triangles,
			polygons: surface.polygons,
			patches: [
				{ name: 'caps & <lids>', firstTriangle: 0, triangleCount: 8 },
				{ name: 'walls', firstTriangle: 8, triangleCount: 12 }
			],
			arrays: [
				{
					name: 'map',
					on: 'point',
					components: 1,
					values: Float64Array.from({ length: points }, (_, i) => Math.sin(i) / 3)
				},
				{
					name: 'displacement',
					on: 'point',
					components: 3,
					values: Float64Array.from({ length: 3 * points }, (_, i) => 0.001 * i)
				},
				{ name: 'quality', on: 'cell', components: 1, values: Float64Array.from({ length: 8 }, (_, i) => i * i) }
			]
		};
	}

	it('VTP, PLY, OBJ and STL, with polygons and arrays', () => {
		const surface = prism();
		const plain = {
			...surface,
			patches: [{ name: '', firstTriangle: 0, triangleCount: 20 }],
			arrays: surface.arrays!.slice(0, 2)
		};
		const files: [string, Uint8Array][] = [
			['ours.vtp', writeVtp(surface, { title: 'a -- test' })],
			['ours.ply', writePly(surface, { title: 'a test' })],
			['ours-ascii.ply', writePly(surface, { encoding: 'ascii' })],
			// meshio 5.0 reads no face properties in binary.
			['plain.ply', writePly(plain)],
			['ours.obj', writeObj(surface)],
			['ours.stl', writeStl({ ...surface, encoding: 'binary', attributes: null })],
			['ours-ascii.stl', writeStl({ ...surface, encoding: 'ascii', attributes: null })]
		];
		for (const [name, bytes] of files) writeFileSync(join(folder, name), bytes);
		const output = vtkFiles('read', ...files.map(([name]) => join(folder, name)));
		const read = JSON.parse(output.slice(output.lastIndexOf('RESULT ') + 7)) as Read[];
		read.forEach((figures, k) => {
			const name = files[k][0];
			expect(figures.triangles, name).toBe(20);
			// The L: area 4, outline 10, height 0.5.
			expect(figures.area, name).toBeCloseTo(2 * 4 + 10 * 0.5, 5);
			expect(figures.volume, name).toBeCloseTo(4 * 0.5, 5);
			if (name.endsWith('.stl')) {
				expect(figures.meshio?.cells, name).toBe(20);
				return;
			}
			expect(figures.positions.map(Math.fround), name).toEqual([...surface.positions]);
			expect(figures.polys, name).toBe(8);
			expect(figures.connectivity, name).toEqual([...surface.polygons!.corners]);
			if (figures.meshio) expect(figures.meshio.points, name).toBe(12);
		});
		const [vtp] = read;
		const ply = read[3];
		expect(vtp.fields['patch names']).toEqual(['caps & <lids>', 'walls']);
		const names = vtp.arrays.map((a) => `${a.on} ${a.name} ${a.components}`);
		expect(names).toEqual(['point map 1', 'point displacement 3', 'cell patch 1', 'cell quality 1']);
		const map = surface.arrays![0].values;
		expect(vtp.arrays[0].first[0]).toBe(map[0]);
		expect(vtp.arrays[0].last[0]).toBe(map[11]);
		expect(vtp.arrays[2].sum).toBe(6);
		expect(vtp.arrays[3].sum).toBe(140);
		expect(ply.meshio!.arrays.map).toBeCloseTo(
			map.reduce((a, b) => a + b, 0),
			12
		);
	});

	it('ADMesh finds our STL closed and right', () => {
		const admesh = debianFile('admesh', '/usr/bin/admesh');
		const surface = parseSurface(new Uint8Array(readFileSync(join(folder, 'small-appended.vtp'))), 'small.vtp');
		for (const encoding of ['binary', 'ascii'] as const) {
			const path = join(folder, `sphere-${encoding}.stl`);
			// ADMesh reads one solid only.
			const patches = [{ name: 'sphere', firstTriangle: 0, triangleCount: 240 }];
			writeFileSync(path, writeStl({ ...surface, patches, encoding, attributes: null }));
			const report = execFileSync(admesh, [path], { encoding: 'utf8' });
			expect(report).toMatch(/Number of facets\s+:\s+240\s+240/);
			expect(report).toMatch(/Total disconnected facets\s+:\s+0\s+0/);
			expect(report).toMatch(/Degenerate facets\s+:\s+0/);
			const volume = Number(/Volume\s*:\s*([\d.]+)/.exec(report)?.[1]);
			expect(volume / manifest['small-appended.vtp'].volume).toBeCloseTo(1, 4);
		}
	});
});
