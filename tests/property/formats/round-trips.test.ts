/** What is written reads back to the same surface, bit for bit: every format and encoding, packed and not. */
import fc from 'fast-check';
import JSZip from 'jszip';
import { gzipSync } from 'node:zlib';
import { describe, expect, it } from 'vitest';
import { writeStl } from '$lib/morph';
import { writeObj } from '$lib/formats/obj-write';
import { writePly } from '$lib/formats/ply-write';
import { parseSurface, readSurface } from '$lib/formats/read';
import type { SurfaceFile } from '$lib/formats/types';
import { writeVtp } from '$lib/formats/vtp-write';
import type { WritableSurface } from '$lib/formats/writable';
import { vtkText, vtpText, type VtpWay } from '../../unit/formats/hand-written';
import { anySurface } from './surfaces';

const bits = (p: Float32Array) => [...new Uint32Array(p.buffer, p.byteOffset, p.length)];

function expectSame(read: SurfaceFile, written: WritableSurface, withArrays: boolean) {
	expect(bits(read.positions)).toEqual(bits(written.positions));
	expect([...read.triangles]).toEqual([...written.triangles]);
	expect(read.polygons && [...read.polygons.corners]).toEqual(written.polygons ? [...written.polygons.corners] : null);
	expect(read.patches).toEqual(written.patches);
	if (!withArrays) return;
	for (const array of written.arrays ?? []) {
		const back = read.arrays.find((a) => a.name === array.name && a.on === array.on);
		expect(back?.components).toBe(array.components);
		expect([...(back?.values ?? [])]).toEqual([...array.values]);
	}
}

describe('written here, read here', () => {
	it('OBJ', () => {
		fc.assert(
			fc.property(anySurface, (surface) => expectSame(parseSurface(writeObj(surface), 'a.obj'), surface, false))
		);
	});

	it.each(['binary', 'ascii'] as const)('PLY, %s', (encoding) => {
		fc.assert(
			fc.property(anySurface, (surface) =>
				expectSame(parseSurface(writePly(surface, { encoding }), 'a.ply'), surface, true)
			)
		);
	});

	it('VTP', () => {
		fc.assert(
			fc.property(anySurface, (surface) => expectSame(parseSurface(writeVtp(surface), 'a.vtp'), surface, true))
		);
	});

	it.each(['binary', 'ascii'] as const)('STL, %s: the corners, and the patches', (encoding) => {
		fc.assert(
			fc.property(anySurface, (surface) => {
				const read = parseSurface(writeStl({ ...surface, attributes: null, encoding }), 'a.stl');
				const corners = (s: { positions: Float32Array; triangles: Uint32Array }) =>
					[...s.triangles].flatMap((v) => [...s.positions.subarray(3 * v, 3 * v + 3)]);
				expect(corners(read)).toEqual(corners(surface));
				if (encoding === 'ascii')
					expect(read.patches.map((p) => p.triangleCount)).toEqual(surface.patches.map((p) => p.triangleCount));
			})
		);
	});

	it('gzip and zip of each', async () => {
		await fc.assert(
			fc.asyncProperty(anySurface, fc.constantFrom('obj', 'ply', 'vtp'), async (surface, format) => {
				const bytes = { obj: writeObj, ply: writePly, vtp: writeVtp }[format](surface);
				const gzipped = await readSurface(gzipSync(bytes), `a.${format}.gz`);
				expect(gzipped).toMatchObject({ packing: 'gzip', filename: `a.${format}`, format });
				expectSame(gzipped, surface, format !== 'obj');
				const zip = new JSZip();
				zip.file('notes.txt', 'words');
				zip.file(`folder/a.${format}`, bytes);
				const zipped = await readSurface(
					await zip.generateAsync({ type: 'uint8array', compression: 'DEFLATE' }),
					'a.zip'
				);
				expect(zipped).toMatchObject({ packing: 'zip', filename: `a.${format}`, format });
				expectSame(zipped, surface, format !== 'obj');
			}),
			{ numRuns: 30 }
		);
	});
});

describe('written by hand in the tests, read here', () => {
	it('VTK legacy, ASCII and binary, versions 3 and 5.1', () => {
		fc.assert(
			fc.property(
				anySurface,
				fc.boolean(),
				fc.constantFrom(3, 5.1),
				fc.boolean(),
				(surface, binary, version, double) => {
					const read = parseSurface(vtkText(surface, { binary, version, double }), 'a.vtk');
					expectSame({ ...read, patches: surface.patches }, surface, true);
				}
			)
		);
	});

	const ways: fc.Arbitrary<VtpWay> = fc.record({
		format: fc.constantFrom('ascii', 'binary', 'raw', 'base64'),
		compressed: fc.boolean(),
		bigEndian: fc.boolean(),
		header: fc.constantFrom(4, 8),
		separateCount: fc.boolean(),
		blockBytes: fc.constantFrom(8, 40, 32768),
		lineBreaks: fc.boolean()
	});

	it('VTP in every way that the format has', () => {
		fc.assert(
			fc.property(anySurface, ways, (surface, way) => {
				const read = parseSurface(vtpText(surface, way), 'a.vtp');
				expectSame({ ...read, patches: surface.patches }, surface, true);
			}),
			{ numRuns: 300 }
		);
	});
});
