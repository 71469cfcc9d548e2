import { readStl } from '$lib/morph';
import { limitsOf } from './assemble';
import { tooManyTriangles } from './errors';
import type { Note, ReadOptions, SurfaceFile } from './types';

const START = 84;
const RECORD = 50;

/** An STL through the engine's reader, with the limits and notes of this folder; see readSurface. */
export function readStlSurface(bytes: Uint8Array, options: ReadOptions): SurfaceFile {
	const limits = limitsOf(options);
	const announced = bytes.length >= START ? new DataView(bytes.buffer, bytes.byteOffset).getUint32(80, true) : 0;
	if (announced > limits.maxTriangles && START + RECORD * announced === bytes.length) {
		throw tooManyTriangles(announced, limits, 80);
	}
	const { checkpoint } = options;
	const mesh = readStl(bytes, { checkpoint });
	const count = mesh.triangles.length / 3;
	if (count > limits.maxTriangles) throw tooManyTriangles(count, limits);
	const notes: Note[] = [];
	const tail = mesh.encoding === 'binary' ? bytes.length - START - RECORD * count : 0;
	if (tail > 0) {
		notes.push({
			code: 'tail',
			text: `${tail} bytes behind the ${count} triangles that the header announces were left out.`
		});
	}
	return {
		format: 'stl',
		encoding: mesh.encoding === 'ascii' ? 'ascii' : 'binary-little-endian',
		packing: 'none',
		filename: '',
		positions: mesh.positions,
		triangles: mesh.triangles,
		polygons: null,
		polygonOfTriangle: null,
		patches: mesh.patches,
		attributes: mesh.attributes,
		arrays: [],
		unusedVertices: 0,
		notes
	};
}
