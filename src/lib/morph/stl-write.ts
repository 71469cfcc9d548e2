import { MorphError } from './errors';
import { float32Text } from './float-text';
import { MAX_NUMBERED_PATCHES, RECORD_BYTES, RECORD_START, encodePatchHeader, headerHoldsNames } from './stl-format';
import type { Mesh, StlEncoding, WithCheckpoint } from './types';

export interface WriteStlOptions extends WithCheckpoint {
	/** Default: the encoding in which the mesh came. */
	encoding?: StlEncoding;
	/** Triangles per chunk, default 65536. */
	chunkTriangles?: number;
}

type WritableMesh = Pick<Mesh, 'positions' | 'triangles' | 'patches'> & Partial<Pick<Mesh, 'attributes' | 'encoding'>>;

const CHUNK_TRIANGLES = 65536;
const littleEndian = new Uint8Array(new Uint16Array([1]).buffer)[0] === 1;

/** Bytes of the binary STL of so many triangles. */
export function stlByteLength(triangleCount: number): number {
	return RECORD_START + RECORD_BYTES * triangleCount;
}

/** Whether a binary STL of this mesh keeps all patch names unshortened (ASCII always does). */
export function binaryKeepsPatchNames(mesh: Pick<Mesh, 'patches' | 'attributes'>): boolean {
	if (mesh.attributes && mesh.patches.length > 1) return false;
	return headerHoldsNames(mesh.patches);
}

/** Writes the unit normal of the triangle (a, b, c) to out; zero for a triangle without area. */
function normalOf(p: Float32Array, a: number, b: number, c: number, out: Float64Array): void {
	const ax = p[3 * a];
	const ay = p[3 * a + 1];
	const az = p[3 * a + 2];
	const ux = p[3 * b] - ax;
	const uy = p[3 * b + 1] - ay;
	const uz = p[3 * b + 2] - az;
	const vx = p[3 * c] - ax;
	const vy = p[3 * c + 1] - ay;
	const vz = p[3 * c + 2] - az;
	const x = uy * vz - uz * vy;
	const y = uz * vx - ux * vz;
	const z = ux * vy - uy * vx;
	const length = Math.sqrt(x * x + y * y + z * z);
	const s = length > 0 ? 1 / length : 0;
	out[0] = x * s;
	out[1] = y * s;
	out[2] = z * s;
}

/**
 * The file in pieces, so that a large one never needs to be one array. Triangle order is the mesh's.
 *
 * Binary with several patches: the header (never beginning with "solid") carries the patch names and each triangle's
 * attribute word its patch number from 1, unless the mesh has attribute words of its own; readStl restores the patches.
 * ASCII: one solid per patch, coordinates in the shortest text that reads back to the same float32.
 */
export function* stlChunks(mesh: WritableMesh, options: WriteStlOptions = {}): Generator<Uint8Array, void> {
	const encoding = options.encoding ?? mesh.encoding ?? 'binary';
	checkPatches(mesh);
	if (encoding === 'binary') yield* binaryChunks(mesh, options);
	else yield* asciiChunks(mesh, options);
}

function checkPatches(mesh: WritableMesh): void {
	const count = mesh.triangles.length / 3;
	let at = 0;
	for (const patch of mesh.patches) {
		if (patch.firstTriangle !== at) break;
		at += patch.triangleCount;
	}
	if (at !== count) {
		throw new MorphError(
			'mesh-shape',
			`The patches end at triangle ${at}, but the mesh has ${count}.`,
			'Give patches that follow each other and cover all triangles.',
			{ triangle: at }
		);
	}
}

function* binaryChunks(mesh: WritableMesh, options: WriteStlOptions): Generator<Uint8Array, void> {
	const { positions, triangles, patches } = mesh;
	const count = triangles.length / 3;
	const own = mesh.attributes ?? null;
	const numbered = !own && patches.length > 1 && patches.length <= MAX_NUMBERED_PATCHES;
	const head = new Uint8Array(RECORD_START);
	// Names without numbers would promise patches that the file does not hold.
	head.set(encodePatchHeader(own || (patches.length > 1 && !numbered) ? [] : patches));
	new DataView(head.buffer).setUint32(80, count, true);
	yield head;
	const per = options.chunkTriangles ?? CHUNK_TRIANGLES;
	const bits = new Uint32Array(positions.buffer, positions.byteOffset, positions.length);
	const normal = new Float64Array(3);
	const floats = new Float32Array(3);
	const floatBits = new Uint32Array(floats.buffer);
	let patch = 0;
	for (let first = 0; first < count; first += per) {
		const last = Math.min(count, first + per);
		const chunk = new Uint8Array(RECORD_BYTES * (last - first));
		const words = littleEndian ? new Uint16Array(chunk.buffer) : null;
		const view = new DataView(chunk.buffer);
		for (let t = first; t < last; t++) {
			const a = triangles[3 * t];
			const b = triangles[3 * t + 1];
			const c = triangles[3 * t + 2];
			normalOf(positions, a, b, c, normal);
			floats[0] = normal[0];
			floats[1] = normal[1];
			floats[2] = normal[2];
			let attribute = own ? own[t] : 0;
			if (numbered) {
				while (t >= patches[patch].firstTriangle + patches[patch].triangleCount) patch++;
				attribute = patch + 1;
			}
			const at = RECORD_BYTES * (t - first);
			if (words) {
				let w = at >> 1;
				for (let d = 0; d < 3; d++, w += 2) {
					words[w] = floatBits[d];
					words[w + 1] = floatBits[d] >>> 16;
				}
				for (let k = 0; k < 3; k++) {
					const v = 3 * (k === 0 ? a : k === 1 ? b : c);
					for (let d = 0; d < 3; d++, w += 2) {
						const bit = bits[v + d];
						words[w] = bit;
						words[w + 1] = bit >>> 16;
					}
				}
				words[w] = attribute;
			} else {
				for (let d = 0; d < 3; d++) {
					view.setFloat32(at + 4 * d, floats[d], true);
					view.setUint32(at + 12 + 4 * d, bits[3 * a + d], true);
					view.setUint32(at + 24 + 4 * d, bits[3 * b + d], true);
					view.setUint32(at + 36 + 4 * d, bits[3 * c + d], true);
				}
				view.setUint16(at + 48, attribute, true);
			}
		}
		yield chunk;
		options.checkpoint?.(last / count);
	}
}

function* asciiChunks(mesh: WritableMesh, options: WriteStlOptions): Generator<Uint8Array, void> {
	const { positions, triangles } = mesh;
	const count = triangles.length / 3;
	const per = Math.min(options.chunkTriangles ?? CHUNK_TRIANGLES, CHUNK_TRIANGLES);
	const encoder = new TextEncoder();
	const normal = new Float64Array(3);
	const vertex = (v: number) =>
		`${float32Text(positions[3 * v])} ${float32Text(positions[3 * v + 1])} ${float32Text(positions[3 * v + 2])}`;
	for (const patch of mesh.patches) {
		const name = patch.name.replace(/[\r\n]+/g, ' ');
		yield encoder.encode(name ? `solid ${name}\n` : 'solid\n');
		const end = patch.firstTriangle + patch.triangleCount;
		for (let first = patch.firstTriangle; first < end; first += per) {
			const last = Math.min(end, first + per);
			const lines: string[] = [];
			for (let t = first; t < last; t++) {
				const a = triangles[3 * t];
				const b = triangles[3 * t + 1];
				const c = triangles[3 * t + 2];
				normalOf(positions, a, b, c, normal);
				const n = [0, 1, 2].map((d) => float32Text(Math.fround(normal[d]))).join(' ');
				lines.push(
					` facet normal ${n}\n  outer loop\n   vertex ${vertex(a)}\n   vertex ${vertex(b)}\n   vertex ${vertex(c)}\n` +
						'  endloop\n endfacet\n'
				);
			}
			yield encoder.encode(lines.join(''));
			options.checkpoint?.(last / count);
		}
		yield encoder.encode(name ? `endsolid ${name}\n` : 'endsolid\n');
	}
}

/** The whole file as one array; see stlChunks. */
export function writeStl(mesh: WritableMesh, options: WriteStlOptions = {}): Uint8Array {
	const encoding = options.encoding ?? mesh.encoding ?? 'binary';
	const parts: Uint8Array[] = [];
	let size = 0;
	const whole = encoding === 'binary' ? new Uint8Array(stlByteLength(mesh.triangles.length / 3)) : null;
	for (const chunk of stlChunks(mesh, options)) {
		if (whole) whole.set(chunk, size);
		else parts.push(chunk);
		size += chunk.length;
	}
	if (whole) return whole;
	const out = new Uint8Array(size);
	let at = 0;
	for (const part of parts) {
		out.set(part, at);
		at += part.length;
	}
	return out;
}
