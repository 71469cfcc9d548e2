/**
 * Mutated files: each parser gets 20,000 and either reads a whole, valid surface (table) or refuses with a typed error that
 * says where and how to mend it. None hangs (the runner's time limit), crashes or takes memory that the file cannot need.
 * FUZZ_SEED repeats a run with another seed, FUZZ_INPUTS changes the number.
 */
import JSZip from 'jszip';
import { deflateSync, gzipSync } from 'node:zlib';
import { describe, expect, it } from 'vitest';
import { MorphError, writeStl } from '$lib/morph';
import { surfaceHealth } from '$lib/formats/health';
import { readObj } from '$lib/formats/obj-read';
import { writeObj } from '$lib/formats/obj-write';
import { readPly } from '$lib/formats/ply-read';
import { writePly } from '$lib/formats/ply-write';
import { parseSurface, readSurface } from '$lib/formats/read';
import { readStlSurface } from '$lib/formats/stl-surface';
import { readMapTable } from '$lib/formats/table-read';
import type { ReadOptions, SurfaceFile } from '$lib/formats/types';
import { readVtk } from '$lib/formats/vtk-read';
import { readVtp } from '$lib/formats/vtp-read';
import { vtkText, vtpText, type VtpWay } from '../../unit/formats/hand-written';
import { pyramid } from '../../unit/formats/pyramid';
import { generator, mutate } from './mutations';

const SEED = Number(process.env.FUZZ_SEED ?? 20240229);
const INPUTS = Number(process.env.FUZZ_INPUTS ?? 20_000);
const LIMITS: ReadOptions = { limits: { maxTriangles: 100_000, maxBytes: 1 << 22 } };
/** Array bytes that a file of some hundred bytes may become: growth from its own size, no more. */
const MOST_BYTES = 1 << 22;

const text = (words: string) => new TextEncoder().encode(words);
const way = (format: VtpWay['format'], compressed = false): VtpWay => ({
	format,
	compressed,
	bigEndian: false,
	header: 4,
	separateCount: false,
	blockBytes: 40,
	lineBreaks: false
});

function checkSurface(surface: SurfaceFile): void {
	const vertices = surface.positions.length / 3;
	const triangles = surface.triangles.length / 3;
	if (!Number.isInteger(vertices) || !Number.isInteger(triangles) || triangles === 0) throw new Error('half a surface');
	if (!surface.positions.every((x) => Number.isFinite(x) && !Object.is(x, -0)))
		throw new Error('a position that is none');
	if (!surface.triangles.every((v) => v < vertices)) throw new Error('a corner without its vertex');
	let at = 0;
	for (const patch of surface.patches) {
		if (patch.firstTriangle !== at || patch.triangleCount < 0) throw new Error('patches with gaps');
		at += patch.triangleCount;
	}
	if (at !== triangles) throw new Error('patches that do not cover');
	const cells = surface.polygons ? surface.polygons.offsets.length - 1 : triangles;
	for (const array of surface.arrays) {
		if (array.values.length !== array.components * (array.on === 'point' ? vertices : cells))
			throw new Error('half an array');
	}
	const arrays = [surface.positions, surface.triangles, ...surface.arrays.map((a) => a.values)];
	if (arrays.reduce((sum, array) => sum + array.byteLength, 0) > MOST_BYTES)
		throw new Error('memory that the file cannot need');
}

const CODES = /^(file|stl|csv|map)-/;

function checkRefusal(thrown: unknown): void {
	if (!(thrown instanceof MorphError)) throw thrown;
	const place = thrown.place ?? {};
	if (!CODES.test(thrown.code)) throw new Error(`odd code ${thrown.code}`);
	if (thrown.message.length < 10 || thrown.mend.length < 10) throw new Error(`few words: ${thrown.message}`);
	if (Object.values(place).filter((v) => typeof v === 'number' && v >= 0).length === 0)
		throw new Error(`no place: ${thrown.message}`);
	if (thrown.message.length > 600) throw new Error('too many words');
}

const show = (bytes: Uint8Array) => Buffer.from(bytes).toString('base64');

function fuzz(
	seeds: Uint8Array[],
	read: (bytes: Uint8Array) => void,
	inputs = INPUTS
): { read: number; refused: number } {
	const random = generator(SEED);
	const count = { read: 0, refused: 0 };
	for (let k = 0; k < inputs; k++) {
		const bytes = mutate(seeds[k % seeds.length], seeds, random);
		try {
			read(bytes);
			count.read++;
		} catch (thrown) {
			try {
				checkRefusal(thrown);
			} catch (fault) {
				throw new Error(`Input ${k} of seed ${SEED}: ${show(bytes)}`, { cause: fault });
			}
			count.refused++;
		}
	}
	return count;
}

const surface = pyramid();
const plain = { ...surface, arrays: [] };
const parsers: [string, (bytes: Uint8Array, options: ReadOptions) => SurfaceFile, Uint8Array[]][] = [
	[
		'STL',
		readStlSurface,
		[
			writeStl({ ...plain, attributes: null, encoding: 'binary' }),
			writeStl({ ...plain, attributes: null, encoding: 'ascii' }),
			text(
				'SOLID a\nFACET NORMAL 0 0 1\nOUTER LOOP\nVERTEX 0 0 0\nVERTEX 1 0 0\nVERTEX 0 1 0\nENDLOOP\nENDFACET\nENDSOLID a'
			)
		]
	],
	[
		'OBJ',
		readObj,
		[
			writeObj(surface),
			text('o a\nv 0 0 0\nv 1 0 0 1 0 0\nv 0 1 0\nvt 0 0\nvn 0 0 1\nusemtl m\nf -3/1/1 \\\n-2//1 -1\nl 1 2\n')
		]
	],
	[
		'PLY',
		readPly,
		[
			writePly(plain, { encoding: 'ascii' }),
			writePly(surface),
			text(
				'ply\nformat ascii 1.0\nelement vertex 4\nproperty float x\nproperty float y\nproperty float z\n' +
					'element tristrips 1\nproperty list int int vertex_indices\nend_header\n0 0 0\n1 0 0\n0 1 0\n1 1 0\n6 0 1 2 3 -1 0\n'
			)
		]
	],
	[
		'VTK legacy',
		readVtk,
		[
			vtkText(surface, { binary: false, version: 3, double: false }),
			vtkText(surface, { binary: true, version: 3, double: false }),
			vtkText(surface, { binary: true, version: 5.1, double: true }),
			text(
				'# vtk DataFile Version 2.0\nt\nASCII\nDATASET POLYDATA\nPOINTS 4 float\n0 0 0 1 0 0 0 1 0 1 1 0\nTRIANGLE_STRIPS 1 5\n4 0 1 2 3\n'
			)
		]
	],
	[
		'VTP',
		readVtp,
		[way('ascii'), way('binary'), way('raw', true), way('base64', true), way('raw')].map((w) => vtpText(surface, w))
	]
];

describe('every parser survives mutated files', () => {
	it.each(parsers)(
		'%s',
		(_, parser, seeds) => {
			// The seeds themselves are read, or the mutations would all fail at the door.
			for (const seed of seeds) expect(() => checkSurface(parser(seed, LIMITS))).not.toThrow();
			const count = fuzz(seeds, (bytes) => checkSurface(parser(bytes, LIMITS)));
			expect(count.read + count.refused).toBe(INPUTS);
			// Both happen, or the mutations are too mild or too harsh to tell anything.
			expect(count.read).toBeGreaterThan(INPUTS / 100);
			expect(count.refused).toBeGreaterThan(INPUTS / 100);
		},
		120_000
	);

	it('tables', () => {
		const seeds = [
			'x,y,z,sensitivity\n0,0,0,1.5\n1,0,0,-2e-3\n0,1,0,3\n',
			'# a comment\n0 0 0 1\n1 0 0 2\n0 1 0 3\n',
			'"x (m)";"y (m)";"z (m)";"gx";"gy";"gz"\n0,5;1,5;0;1;2;3\n1,5;0;0;-1,25;2;3\n',
			'name\tx\ty\tz\tvalue\nroof\t0\t0\t0\t1\n"left\twing"\t1\t0\t0\t2\n'
		].map(text);
		const count = fuzz(seeds, (bytes) => {
			const { table } = readMapTable(bytes, 'map.csv');
			const sound = table.points.every(Number.isFinite) && table.values.every(Number.isFinite);
			if (!sound || table.points.length !== 3 * table.rows || table.rows === 0) throw new Error('half a table');
			if (table.values.length !== table.components * table.rows || table.lines.length !== table.rows)
				throw new Error('half a table');
		});
		expect(count.read + count.refused).toBe(INPUTS);
		expect(count.read).toBeGreaterThan(INPUTS / 100);
		expect(count.refused).toBeGreaterThan(INPUTS / 100);
	}, 120_000);

	it('the door for all formats, whatever the name says', () => {
		const seeds = parsers.flatMap(([, , files]) => files);
		const names = ['a.stl', 'a.obj', 'a.ply', 'a.vtk', 'a.vtp', 'a'];
		let k = 0;
		const count = fuzz(seeds, (bytes) => checkSurface(parseSurface(bytes, names[k++ % names.length], LIMITS)));
		expect(count.read).toBeGreaterThan(INPUTS / 100);
		expect(count.refused).toBeGreaterThan(INPUTS / 100);
	}, 120_000);

	it('surfaces of any kind can be examined', () => {
		const count = fuzz(
			[writeObj(surface)],
			(bytes) => {
				const health = surfaceHealth(readObj(bytes, LIMITS), { intersectionBudget: 1000 });
				if (health.findings.some((f) => f.count <= 0 || f.text.length < 20)) throw new Error('an empty finding');
			},
			Math.min(INPUTS, 2000)
		);
		expect(count.read).toBeGreaterThan(0);
	}, 120_000);
});

describe('packed files', () => {
	it('mutated archives are refused or read', async () => {
		const zip = new JSZip();
		zip.file('a.obj', writeObj(surface));
		const seeds = [
			gzipSync(writeObj(surface)),
			await zip.generateAsync({ type: 'uint8array', compression: 'DEFLATE' })
		];
		const random = generator(SEED);
		let refused = 0;
		const inputs = Math.min(INPUTS, 4000);
		for (let k = 0; k < inputs; k++) {
			const bytes = mutate(new Uint8Array(seeds[k % 2]), seeds, random);
			try {
				checkSurface(await readSurface(bytes, k % 2 ? 'a.zip' : 'a.obj.gz', LIMITS));
			} catch (thrown) {
				try {
					checkRefusal(thrown);
				} catch (fault) {
					throw new Error(`Input ${k} of seed ${SEED}: ${show(bytes)}`, { cause: fault });
				}
				refused++;
			}
		}
		expect(refused).toBeGreaterThan(inputs / 10);
	}, 120_000);

	it('bombs are stopped at the limit: gzip, zip, and zlib in VTP', async () => {
		const bomb = new Uint8Array(64 << 20);
		const code = async (bytes: Uint8Array, name: string) => {
			try {
				await readSurface(bytes, name, LIMITS);
			} catch (thrown) {
				checkRefusal(thrown);
				return (thrown as MorphError).code;
			}
			return 'read';
		};
		expect(await code(gzipSync(bomb), 'a.stl.gz')).toBe('file-too-large');
		const zip = new JSZip();
		zip.file('a.stl', bomb);
		expect(await code(await zip.generateAsync({ type: 'uint8array', compression: 'DEFLATE' }), 'a.zip')).toBe(
			'file-too-large'
		);
		const packed = deflateSync(bomb);
		const head = Buffer.alloc(16);
		[1, bomb.length, 0, packed.length].forEach((word, k) => head.writeUInt32LE(word, 4 * k));
		const file = Buffer.concat([
			Buffer.from(
				'<VTKFile type="PolyData" byte_order="LittleEndian" compressor="vtkZLibDataCompressor"><PolyData>' +
					'<Piece NumberOfPoints="5000000"><Points><DataArray type="Float32" NumberOfComponents="3" format="appended" offset="0"/>' +
					'</Points></Piece></PolyData><AppendedData encoding="raw">_'
			),
			head,
			packed,
			Buffer.from('</AppendedData></VTKFile>')
		]);
		expect(await code(file, 'a.vtp')).toBe('file-syntax');
	}, 60_000);
});
