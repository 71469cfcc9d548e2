import JSZip from 'jszip';
import { gzipSync } from 'node:zlib';
import { describe, expect, it } from 'vitest';
import { surfaceMeasures, writeStl, type MorphError } from '$lib/morph';
import { displacementArray, writeDisplacementCsv } from '$lib/formats/field-write';
import { mapFromArray } from '$lib/formats/map-arrays';
import { writeObj } from '$lib/formats/obj-write';
import { writePly } from '$lib/formats/ply-write';
import { parseSurface, readSurface } from '$lib/formats/read';
import { readMapTable } from '$lib/formats/table-read';
import { writeVtp } from '$lib/formats/vtp-write';
import { vtkText } from './hand-written';
import { pyramid } from './pyramid';

const bytes = (text: string) => new TextEncoder().encode(text);
const refusal = async (read: () => unknown): Promise<MorphError> => {
	try {
		await read();
	} catch (thrown) {
		return thrown as MorphError;
	}
	throw new Error('It was read.');
};

describe('the format is told by content first', () => {
	it('whatever the name says', () => {
		const surface = pyramid();
		const files: [string, Uint8Array][] = [
			['stl', writeStl({ ...surface, attributes: null, encoding: 'binary' })],
			['stl', writeStl({ ...surface, attributes: null, encoding: 'ascii' })],
			['obj', writeObj(surface)],
			['ply', writePly(surface)],
			['vtp', writeVtp(surface)],
			['vtk', vtkText(surface, { binary: true, version: 3, double: false })]
		];
		for (const [format, file] of files) {
			for (const name of ['a.stl', 'a.obj', 'a.ply', 'a.vtk', 'a.vtp', 'a', 'a.txt']) {
				expect(parseSurface(file, name).format).toBe(format);
			}
		}
	});

	it.each([
		['ISO-10303-21;\nHEADER;', 'a.step', 'STEP'],
		['OFF\n3 1 0\n', 'a.off', 'OFF'],
		['glTF\x02\0\0\0', 'a.glb', 'glTF'],
		['just some words', 'a.txt', 'no format']
	])('%j is refused by its name', async (text, name, word) => {
		const error = await refusal(() => parseSurface(bytes(text), name));
		expect(error.code).toBe('file-unknown');
		expect(error.message).toContain(word);
	});
});

describe('OBJ', () => {
	it('groups, objects, negative numbers, continued lines, comments, reopened groups', () => {
		const text = [
			'# a test',
			'o body',
			'v 0 0 0 1 0 0 # with a colour',
			'v 1 0 \\',
			'  0',
			'v 1 1 0',
			'v 0 1 0',
			'g a',
			'f 1/1/1 2//2 3/3',
			'g b c',
			'f -4 -2 \\',
			' -1',
			'g a',
			'f 1 2 3 4'
		].join('\r\n');
		const surface = parseSurface(bytes(text), 'a.obj');
		expect([...surface.triangles]).toEqual([0, 1, 2, 0, 2, 3, 0, 1, 2, 0, 2, 3]);
		expect(surface.patches.map((p) => [p.name, p.triangleCount])).toEqual([
			['body/a', 1],
			['body/b c', 1],
			['body/a', 2]
		]);
		expect([...surface.polygonOfTriangle!]).toEqual([0, 1, 2, 2]);
	});

	it.each([
		['v 0 0\n', 'file-syntax', 1],
		['v 0 0 0\nf 1 2 3\n', 'file-syntax', 2],
		['v 0 0 nan\n', 'file-non-finite', 1],
		['v 0 0 1e39\n', 'file-non-finite', 1],
		['v 0 0 0\nv 1 0 0\nv 0 1 0\nf 1 2 0\n', 'file-syntax', 4],
		['v 0 0 0\nv 1 0 0\nv 0 1 0\nf 1 2 -9\n', 'file-syntax', 4],
		['v 0 0 0\nv 1 0 0\nv 0 1 0\nf 1 2 x\n', 'file-syntax', 4],
		['v 0 0 0\nv 1 0 0\nv 0 1 0\nf 1 2 3\n!!\n', 'file-syntax', 5],
		['v 0 0 0\nv 1 0 0\nv 0 1 0\nf 1 2', 'file-truncated', 4]
	])('%j is refused', async (text, code, line) => {
		const error = await refusal(() => parseSurface(bytes(text), 'a.obj'));
		expect([error.code, error.place?.line]).toEqual([code, line]);
	});
});

describe('PLY', () => {
	it('properties in any order, aliases, other elements and lists, big-endian', () => {
		const header =
			'ply\r\nformat binary_big_endian 1.0\r\ncomment by hand\r\nelement camera 1\r\nproperty list uchar float view\r\n' +
			'element vertex 3\r\nproperty double z\r\nproperty uint8 red\r\nproperty float32 x\r\nproperty int16 y\r\n' +
			'property float64 pressure\r\nelement face 1\r\nproperty int8 region\r\nproperty list uint16 uint32 vertex_index\r\n' +
			'property list uchar float texcoord\r\nend_header\r\n';
		const view = new DataView(new ArrayBuffer(200));
		let at = 0;
		const put = (kind: 'Uint8' | 'Int8' | 'Int16' | 'Uint16' | 'Uint32' | 'Float32' | 'Float64', value: number) => {
			view[`set${kind}`](at, value);
			at += Number(/\d+/.exec(kind)![0]) / 8;
		};
		put('Uint8', 2);
		put('Float32', 5);
		put('Float32', 6);
		const vertices = [
			[0.1, 0, 0, 1.5],
			[0, 1, 0, 2.5],
			[0, 0, -2, 3.5]
		];
		for (const [z, x, y, p] of vertices) {
			put('Float64', z);
			put('Uint8', 255);
			put('Float32', x);
			put('Int16', y);
			put('Float64', p);
		}
		put('Int8', -4);
		put('Uint16', 3);
		for (const v of [2, 1, 0]) put('Uint32', v);
		put('Uint8', 1);
		put('Float32', 9);
		const file = new Uint8Array([...bytes(header), ...new Uint8Array(view.buffer, 0, at)]);
		const surface = parseSurface(file, 'a.ply');
		expect([...surface.positions]).toEqual([0, 0, Math.fround(0.1), 1, 0, 0, 0, -2, 0]);
		expect([...surface.triangles]).toEqual([2, 1, 0]);
		expect(surface.arrays.map((a) => [a.on, a.name, [...a.values]])).toEqual([
			['point', 'pressure', [1.5, 2.5, 3.5]],
			['cell', 'region', [-4]]
		]);
		expect(surface.patches).toEqual([{ name: 'region -4', firstTriangle: 0, triangleCount: 1 }]);
		expect(surface.notes.map((n) => n.code)).toContain('digits-lost');
	});

	it.each([
		['element vertex 99999999999', 'file-truncated'],
		['element vertex -3', 'file-syntax'],
		['element vertex 3\nproperty quad x', 'file-syntax'],
		['property float x', 'file-syntax']
	])('a header with %j is refused before memory is taken', async (line, code) => {
		const text = `ply\nformat ascii 1.0\n${line}\nproperty float x\nproperty float y\nproperty float z\nelement face 1\nproperty list uchar int vertex_indices\nend_header\n0 0 0`;
		expect((await refusal(() => parseSurface(bytes(text), 'a.ply'))).code).toBe(code);
	});
});

describe('VTP', () => {
	it('pieces are joined in their order; arrays that one of them lacks are left out', () => {
		const piece = (x: number, verts: string, more: string) =>
			`<Piece NumberOfPoints="4" NumberOfPolys="1" NumberOfStrips="1" NumberOfVerts="${verts ? 1 : 0}">` +
			`<Points><DataArray type="Float32" NumberOfComponents="3">${x} 0 0 ${x + 1} 0 0 ${x} 1 0 ${x + 1} 1 0</DataArray></Points>` +
			verts +
			'<Polys><DataArray type="Int32" Name="connectivity">0 1 2</DataArray><DataArray type="Int32" Name="offsets">3</DataArray></Polys>' +
			'<Strips><DataArray type="Int32" Name="connectivity">0 1 2 3</DataArray><DataArray type="Int32" Name="offsets">4</DataArray></Strips>' +
			`<PointData><DataArray type="Float64" Name="p">${x} 1 2 3</DataArray>${more}</PointData>` +
			`<CellData><DataArray type="Int32" Name="c">${verts ? '7 ' : ''}${x} ${x + 1}</DataArray></CellData></Piece>`;
		const vert =
			'<Verts><DataArray type="Int32" Name="connectivity">0</DataArray><DataArray type="Int32" Name="offsets">1</DataArray></Verts>';
		const text = `<VTKFile type="PolyData"><PolyData>${piece(0, '', '<DataArray type="Float64" Name="q">1 2 3 4</DataArray>')}${piece(5, vert, '')}</PolyData></VTKFile>`;
		const surface = parseSurface(bytes(text), 'a.vtp');
		// Polygons of both pieces, then the strips of both.
		expect([...surface.triangles]).toEqual([0, 1, 2, 4, 5, 6, 0, 1, 2, 2, 1, 3, 4, 5, 6, 6, 5, 7]);
		expect(surface.arrays.map((a) => [a.name, [...a.values]])).toEqual([
			['p', [0, 1, 2, 3, 5, 1, 2, 3]],
			['c', [0, 5, 1, 1, 6, 6]]
		]);
		expect(surface.notes.map((n) => n.code)).toEqual(expect.arrayContaining(['dropped', 'odd-structure', 'strips']));
	});

	it.each([
		['type="PolyData"', 'type="UnstructuredGrid"', 'file-unsupported'],
		['header_type="UInt64"', 'header_type="UInt16"', 'file-syntax'],
		['header_type="UInt64"', 'header_type="UInt64" compressor="vtkLZMADataCompressor"', 'file-unsupported'],
		['</PolyData>', '</Polydata>', 'file-syntax'],
		['NumberOfPoints="5"', 'NumberOfPoints="500000000"', 'file-syntax']
	])('%s as %s is refused at its line', async (from, to, code) => {
		const text = Buffer.from(writeVtp(pyramid())).toString('latin1').replace(from, to);
		const error = await refusal(() => parseSurface(Buffer.from(text, 'latin1'), 'a.vtp'));
		expect(error.code).toBe(code);
		expect(Object.keys(error.place ?? {})).toContain('byte');
	});
});

describe('limits and packing', () => {
	it('too many triangles are refused, from the header where it tells', async () => {
		const surface = pyramid();
		const limits = { maxTriangles: 5 };
		for (const file of [
			writeStl({ ...surface, attributes: null, encoding: 'binary' }),
			writeObj(surface),
			writePly(surface),
			writeVtp(surface)
		]) {
			expect((await refusal(() => parseSurface(file, 'a', { limits }))).code).toBe('file-too-large');
		}
		const head = new Uint8Array(84 + 50 * 6);
		new DataView(head.buffer).setUint32(80, 6, true);
		const error = await refusal(() => parseSurface(head, 'a.stl', { limits }));
		expect(error).toMatchObject({ code: 'file-too-large', place: { byte: 80 } });
		expect((await refusal(() => readSurface(writeObj(surface), 'a.obj', { limits: { maxBytes: 10 } }))).code).toBe(
			'file-too-large'
		);
	});

	it('a zip with several surfaces is refused by naming them, one among other files is read', async () => {
		const zip = new JSZip();
		zip.file('readme.txt', 'words');
		zip.file('__MACOSX/._a.obj', 'x');
		const pack = () => zip.generateAsync({ type: 'uint8array' });
		const none = await refusal(async () => readSurface(await pack(), 'a.zip'));
		expect(none.code).toBe('file-unknown');
		zip.file('deep/a.obj', writeObj(pyramid()));
		expect((await readSurface(await pack(), 'a.zip')).filename).toBe('a.obj');
		zip.file('b.stl.gz', gzipSync('solid'));
		const several = await refusal(async () => readSurface(await pack(), 'a.zip'));
		expect(several.code).toBe('file-unsupported');
		expect(several.message).toMatch(/"deep\/a\.obj".*"b\.stl\.gz"/);
		zip.remove('deep');
		zip.file('b.stl.gz', gzipSync(writeObj(pyramid())));
		expect(await readSurface(await pack(), 'a.zip')).toMatchObject({
			filename: 'b.stl',
			format: 'obj',
			packing: 'zip'
		});
	});

	it('a cut or damaged archive is refused', async () => {
		const file = new Uint8Array(gzipSync(writeObj(pyramid())));
		expect((await refusal(() => readSurface(file.subarray(0, file.length - 12), 'a.gz'))).code).toBe('file-truncated');
		const damaged = file.slice();
		damaged.fill(0xff, 12, 40);
		expect((await refusal(() => readSurface(damaged, 'a.gz'))).code).toBe('file-syntax');
	});

	it('a binary STL longer than its count says is read, and says so', () => {
		const file = new Uint8Array([...writeStl({ ...pyramid(), attributes: null, encoding: 'binary' }), 1, 2, 3]);
		const surface = parseSurface(file, 'a.stl');
		expect(surface.triangles).toHaveLength(18);
		expect(surface.notes).toMatchObject([{ code: 'tail' }]);
	});
});

describe('regressions', () => {
	it('bytes of a pooled Buffer are copied, not shared (zlib gives such ones)', () => {
		const file = vtkText(pyramid(), { binary: true, version: 3, double: false });
		const pooled = Buffer.from(file);
		const surface = parseSurface(pooled, 'a.vtk');
		pooled.fill(0);
		expect([...surface.positions]).toEqual([...pyramid().positions]);
	});

	it('a control character behind a vertex does not hold the reader of OBJ for ever', async () => {
		const error = await refusal(() => parseSurface(bytes('v 2 2 0\x0ev 0 2 0\nf 1 1 2\n'), 'a.obj'));
		expect(error.code).toBe('file-syntax');
	});

	it('a coordinate too small for 32 bits becomes +0', () => {
		const positions = Float64Array.from(pyramid().positions);
		positions[0] = -1e-300;
		const cells = 'POLYGONS 4 16\n3 0 1 2 3 0 2 3 3 0 1 4 3 1 2 4\n';
		const text = `# vtk DataFile Version 3.0\nt\nASCII\nDATASET POLYDATA\nPOINTS 5 double\n${[...positions].join(' ')}\n${cells}`;
		expect(Object.is(parseSurface(bytes(text), 'a.vtk').positions[0], 0)).toBe(true);
	});
});

describe('what leaves', () => {
	it('the displacement field in file order, exact', () => {
		const before = Float32Array.from([0.1, 2, -3, 4e-7, 5, 6]);
		const after = Float32Array.from([0.10000001, 2, -3.5, 4e-7, 5, 6.000001]);
		const { table } = readMapTable(writeDisplacementCsv({ before, after }), 'field.csv');
		expect([...table.points].map(Math.fround)).toEqual([...before]);
		expect(Float32Array.from(table.values, (d, i) => before[i] + d)).toEqual(after);
		expect([...displacementArray({ before, after }).values]).toEqual([...table.values]);
	});

	it('values of cells come to the triangles of their polygon: densities as they are, totals by area', () => {
		const surface = parseSurface(writeVtp(pyramid()), 'a.vtp');
		const density = mapFromArray(surface, { name: 'quality', on: 'cell', total: false });
		expect([...density.values]).toEqual([1, 1, 2, 3, 4, 5]);
		const total = mapFromArray(surface, { name: 'quality', on: 'cell', total: true });
		expect([...total.values]).toEqual([0.5, 0.5, 2, 3, 4, 5]);
		expect([...mapFromArray(surface, { name: 'map', on: 'point', total: false }).values]).toEqual([
			0.5, -1, 2, 0.25, 7
		]);
	});

	it('the pyramid itself: volume a third of base times height', () => {
		const { positions, triangles } = pyramid();
		const measures = surfaceMeasures(Float64Array.from(positions), triangles);
		expect(measures).toMatchObject({ closed: true });
		expect(measures.volume).toBeCloseTo((4 * 1.5) / 3, 12);
	});
});
