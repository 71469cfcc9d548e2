import { describe, expect, it } from 'vitest';
import { MorphError, readStl, stlByteLength, stlChunks, writeStl, type Mesh, type MorphErrorCode } from '$lib/morph';
import { cube } from './shapes';

const ascii = (text: string) => new TextEncoder().encode(text);
const FACET =
	' facet normal 0 0 1\n  outer loop\n   vertex 0 0 0\n   vertex 1 0 0\n   vertex 0 1 0\n  endloop\n endfacet\n';

function cubeMesh(patches?: Mesh['patches']): Mesh {
	const { positions, triangles } = cube(1);
	return {
		positions: Float32Array.from(positions),
		triangles,
		patches: patches ?? [{ name: '', firstTriangle: 0, triangleCount: 12 }],
		attributes: null,
		encoding: 'binary'
	};
}

function refusal(bytes: Uint8Array): MorphError {
	try {
		readStl(bytes);
	} catch (error) {
		if (error instanceof MorphError) return error;
		throw error;
	}
	throw new Error('was not refused');
}

describe('reading STL', () => {
	it('welds a binary cube to 8 vertices numbered by first appearance', () => {
		const bytes = writeStl(cubeMesh(), { encoding: 'binary' });
		// Library of Congress fdd000505: 80 + 4 + 50 n bytes.
		expect(bytes.length).toBe(84 + 50 * 12);
		expect(stlByteLength(12)).toBe(bytes.length);
		const mesh = readStl(bytes);
		expect(mesh.positions.length).toBe(24);
		expect(mesh.triangles.length).toBe(36);
		let seen = -1;
		for (const v of mesh.triangles) {
			expect(v).toBeLessThanOrEqual(seen + 1);
			seen = Math.max(seen, v);
		}
		expect(mesh.encoding).toBe('binary');
	});

	it('reads binary files whose header begins with "solid" (14 % of sampled files do: ChubV/php-stl issue 52)', () => {
		const bytes = writeStl(cubeMesh());
		bytes.set(ascii('solid cube facet normal'), 0);
		expect(readStl(bytes).encoding).toBe('binary');
		expect(readStl(bytes).triangles.length).toBe(36);
	});

	it('reads binary files with trailing bytes, at any byte offset', () => {
		const bytes = writeStl(cubeMesh());
		const longer = new Uint8Array(bytes.length + 8);
		longer.set(bytes, 1);
		expect(readStl(longer.subarray(1)).triangles).toEqual(readStl(bytes).triangles);
	});

	it('keeps attribute words when one of them is not zero', () => {
		const bytes = writeStl(cubeMesh());
		expect(readStl(bytes).attributes).toBeNull();
		new DataView(bytes.buffer).setUint16(84 + 48, 0x2020, true);
		const mesh = readStl(bytes);
		expect(Array.from(mesh.attributes ?? [])).toEqual([0x2020, ...new Array(11).fill(0)]);
		expect(readStl(writeStl(mesh)).attributes).toEqual(mesh.attributes);
	});

	it('reads ASCII in any case and spacing, keeps several solids (also empty ones) and long names', () => {
		const name = 'n'.repeat(200);
		const text = `SOLID ${name}\r\n${FACET.toUpperCase().replace(/ +/g, '\t')}ENDSOLID ${name}\n\nsolid second part\nendsolid\nsolid third\n${FACET}${FACET}endsolid third`;
		const mesh = readStl(ascii(text));
		expect(mesh.patches).toEqual([
			{ name, firstTriangle: 0, triangleCount: 1 },
			{ name: 'second part', firstTriangle: 1, triangleCount: 0 },
			{ name: 'third', firstTriangle: 1, triangleCount: 2 }
		]);
		expect(Array.from(mesh.triangles)).toEqual([0, 1, 2, 0, 1, 2, 0, 1, 2]);
		expect(mesh.encoding).toBe('ascii');
	});

	it('reads ASCII on one line', () => {
		const mesh = readStl(ascii(`solid a ${FACET.replace(/\s+/g, ' ')}endsolid a`));
		expect(mesh.patches).toEqual([{ name: 'a', firstTriangle: 0, triangleCount: 1 }]);
	});

	it('welds -0 with +0 and keeps degenerate triangles', () => {
		const text =
			'solid\n' +
			FACET +
			FACET.replace('vertex 0 0 0', 'vertex -0 0 -0').replace('vertex 1 0 0', 'vertex 0 0 0') +
			'endsolid\n';
		const mesh = readStl(ascii(text));
		expect(mesh.positions.length).toBe(9);
		expect(Array.from(mesh.triangles)).toEqual([0, 1, 2, 0, 0, 2]);
		expect(Array.from(mesh.positions).some((x) => Object.is(x, -0))).toBe(false);
	});

	const cases: [string, Uint8Array, MorphErrorCode, object][] = [
		['an empty file', new Uint8Array(0), 'stl-empty', { byte: 0 }],
		['a binary file without triangles', new Uint8Array(84), 'stl-empty', { byte: 80 }],
		['an ASCII file without triangles', ascii('solid a\nendsolid a\n'), 'stl-empty', { line: 3 }],
		[
			'a truncated binary file',
			writeStl(cubeMesh()).subarray(0, 84 + 50 * 7 + 13),
			'stl-truncated',
			{ triangle: 7, byte: 447 }
		],
		['a truncated ASCII file', ascii(`solid a\n${FACET}${FACET.slice(0, 60)}`), 'stl-truncated', { line: 12 }],
		['ASCII without its end', ascii(`solid a\n${FACET}`), 'stl-truncated', { line: 9 }],
		['garbage', ascii('<!doctype html><html><body>Not found</body></html>'.repeat(5)), 'stl-not-stl', { byte: 0 }],
		['a short text', ascii('hello'), 'stl-not-stl', { byte: 0 }],
		['a word for a number', ascii(`solid a\n${FACET.replace('1 0 0', '1 x 0')}endsolid`), 'stl-syntax', { line: 5 }],
		[
			'a facet of four vertices',
			ascii(`solid a\n${FACET.replace('  endloop', '   vertex 1 1 0\n  endloop')}endsolid`),
			'stl-syntax',
			{ line: 7 }
		],
		[
			'an ASCII nan',
			ascii(`solid a\n${FACET.replace('1 0 0', '1 nan 0')}endsolid`),
			'stl-non-finite',
			{ line: 5, triangle: 0 }
		],
		[
			'a number beyond float32',
			ascii(`solid a\n${FACET.replace('1 0 0', '1e39 0 0')}endsolid`),
			'stl-non-finite',
			{ line: 5 }
		]
	];
	it.each(cases)('refuses %s, naming the place and the mend', (_, bytes, code, place) => {
		const error = refusal(bytes);
		expect(error.code).toBe(code);
		expect(error.place).toMatchObject(place);
		expect(error.mend.length).toBeGreaterThan(10);
	});

	it('refuses a binary coordinate that is not finite, naming triangle and byte', () => {
		for (const bad of [NaN, Infinity, -Infinity]) {
			const bytes = writeStl(cubeMesh());
			new DataView(bytes.buffer).setFloat32(84 + 50 * 3 + 12 + 4, bad, true);
			expect(refusal(bytes)).toMatchObject({ code: 'stl-non-finite', place: { triangle: 3, byte: 250 } });
		}
	});

	it('lets the caller cancel', () => {
		const bytes = writeStl(cubeMesh());
		expect(() =>
			readStl(bytes, {
				checkpoint: () => {
					throw new Error('cancelled');
				}
			})
		).toThrow('cancelled');
	});
});

describe('writing STL', () => {
	const patches = [
		{ name: 'nose', firstTriangle: 0, triangleCount: 4 },
		{ name: 'empty', firstTriangle: 4, triangleCount: 0 },
		{ name: 'tail fin', firstTriangle: 4, triangleCount: 8 }
	];

	it('restores the patches from its own binary header, which never begins with "solid"', () => {
		const solid = patches.map((p, i) => ({ ...p, name: i === 0 ? 'solid' : p.name }));
		const bytes = writeStl(cubeMesh(solid), { encoding: 'binary' });
		expect(new TextDecoder().decode(bytes.subarray(0, 5)).toLowerCase()).not.toBe('solid');
		const mesh = readStl(bytes);
		expect(mesh.patches).toEqual(solid);
		expect(mesh.attributes).toBeNull();
		expect(new DataView(bytes.buffer).getUint16(84 + 50 * 11 + 48, true)).toBe(3);
	});

	it('shortens patch names that do not fit the header and keeps their triangles', () => {
		const long = patches.map((p) => ({ ...p, name: `${p.name} `.repeat(30).trim() }));
		const mesh = readStl(writeStl(cubeMesh(long), { encoding: 'binary' }));
		expect(mesh.patches.map((p) => p.triangleCount)).toEqual([4, 0, 8]);
		mesh.patches.forEach((p, i) => expect(long[i].name.startsWith(p.name) && p.name.length > 5).toBe(true));
	});

	it('writes ASCII solids that read back whole', () => {
		const first = cubeMesh(patches);
		const mesh = readStl(writeStl(first, { encoding: 'ascii' }));
		expect(mesh.patches).toEqual(patches);
		const corners = (m: Mesh) =>
			Array.from(m.triangles).flatMap((v) => Array.from(m.positions.subarray(3 * v, 3 * v + 3)));
		expect(corners(mesh)).toEqual(corners(first));
	});

	it('gives the same bytes in chunks as in one array', () => {
		for (const encoding of ['binary', 'ascii'] as const) {
			const parts = [...stlChunks(cubeMesh(patches), { encoding, chunkTriangles: 5 })];
			expect(parts.length).toBeGreaterThan(3);
			const joined = Buffer.concat(parts);
			expect(joined.equals(writeStl(cubeMesh(patches), { encoding }))).toBe(true);
		}
	});

	it('writes unit normals by the right-hand rule', () => {
		const bytes = writeStl(cubeMesh());
		const view = new DataView(bytes.buffer);
		const normal = [0, 1, 2].map((d) => view.getFloat32(84 + 4 * d, true));
		// The first face of the cube lies at x = 0.
		expect(normal).toEqual([-1, 0, 0]);
	});

	it('refuses patches that do not cover the triangles', () => {
		expect(() => writeStl(cubeMesh(patches.slice(0, 2)))).toThrow(MorphError);
	});
});
