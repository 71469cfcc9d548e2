import { checkWritable, type WritableSurface } from './writable';

export interface WriteGlbOptions {
	/** Metres per unit of the positions: glTF is in metres; default 1. */
	metresPerUnit?: number;
	/** Axis that points up in the study, default 'z'; glTF's is y. */
	up?: 'x' | 'y' | 'z';
	/** N x 3 or N x 4 linear colours in [0, 1] by vertex; borrowed. */
	colours?: Float32Array;
	/** Name of the scene's root. */
	title?: string;
}

/** Layout of glTF 2.0, section 4 (binary glTF) and 5 (properties). */
const MAGIC = 0x46546c67;
const VERSION = 2;
const JSON_CHUNK = 0x4e4f534a;
const BIN_CHUNK = 0x004e4942;
const FLOAT = 5126;
const UNSIGNED_INT = 5125;
const ARRAY_BUFFER = 34962;
const ELEMENT_ARRAY_BUFFER = 34963;
const HALF = Math.SQRT1_2;
/** Quaternions that turn the study's up axis to +y. */
const TURN = { x: [0, 0, HALF, HALF], y: [0, 0, 0, 1], z: [-HALF, 0, 0, HALF] };

function extremes(p: Float32Array): { min: number[]; max: number[] } {
	const min = [Infinity, Infinity, Infinity];
	const max = [-Infinity, -Infinity, -Infinity];
	for (let i = 0; i < p.length; i++) {
		const d = i % 3;
		if (p[i] < min[d]) min[d] = p[i];
		if (p[i] > max[d]) max[d] = p[i];
	}
	return { min, max };
}

/** Area-weighted vertex normals, unit length; (0,0,1) where a vertex has no area, since glTF wants unit vectors. */
function vertexNormals(p: Float32Array, triangles: Uint32Array): Float32Array {
	const sum = new Float64Array(p.length);
	for (let t = 0; t < triangles.length; t += 3) {
		const [a, b, c] = [3 * triangles[t], 3 * triangles[t + 1], 3 * triangles[t + 2]];
		const [ux, uy, uz] = [p[b] - p[a], p[b + 1] - p[a + 1], p[b + 2] - p[a + 2]];
		const [vx, vy, vz] = [p[c] - p[a], p[c + 1] - p[a + 1], p[c + 2] - p[a + 2]];
		const n = [uy * vz - uz * vy, uz * vx - ux * vz, ux * vy - uy * vx];
		for (const v of [a, b, c]) for (let d = 0; d < 3; d++) sum[v + d] += n[d];
	}
	const out = new Float32Array(p.length);
	for (let v = 0; v < p.length; v += 3) {
		const length = Math.hypot(sum[v], sum[v + 1], sum[v + 2]);
		for (let d = 0; d < 3; d++) out[v + d] = length > 0 ? sum[v + d] / length : d === 2 ? 1 : 0;
	}
	return out;
}

/**
 * A binary glTF 2.0 file for viewers: one mesh with a primitive per patch over common vertices, normals, and colours where
 * given; a root node brings it to metres with y up. Vertex and triangle order are kept; polygons become their triangles.
 */
export function writeGlb(surface: WritableSurface, options: WriteGlbOptions = {}): Uint8Array {
	checkWritable(surface);
	const { positions, triangles, patches } = surface;
	const vertexCount = positions.length / 3;
	const views: object[] = [];
	const accessors: object[] = [];
	const buffers: Uint8Array[] = [];
	let size = 0;
	const addView = (array: Float32Array | Uint32Array, target: number) => {
		views.push({ buffer: 0, byteOffset: size, byteLength: array.byteLength, target });
		buffers.push(new Uint8Array(array.buffer, array.byteOffset, array.byteLength));
		size += array.byteLength;
		return views.length - 1;
	};
	const attributes: Record<string, number> = {};
	const addAttribute = (name: string, array: Float32Array, type: string, more: object = {}) => {
		const bufferView = addView(array, ARRAY_BUFFER);
		attributes[name] = accessors.push({ bufferView, componentType: FLOAT, count: vertexCount, type, ...more }) - 1;
	};
	addAttribute('POSITION', positions, 'VEC3', extremes(positions));
	addAttribute('NORMAL', vertexNormals(positions, triangles), 'VEC3');
	if (options.colours)
		addAttribute('COLOR_0', options.colours, options.colours.length === 4 * vertexCount ? 'VEC4' : 'VEC3');
	const indices = addView(triangles, ELEMENT_ARRAY_BUFFER);
	// A primitive must not be empty.
	const primitives = patches
		.filter((patch) => patch.triangleCount > 0)
		.map((patch) => ({
			attributes,
			indices:
				accessors.push({
					bufferView: indices,
					byteOffset: 12 * patch.firstTriangle,
					componentType: UNSIGNED_INT,
					count: 3 * patch.triangleCount,
					type: 'SCALAR'
				}) - 1,
			material: 0,
			extras: { patch: patch.name }
		}));
	const scale = options.metresPerUnit ?? 1;
	const json = {
		asset: { version: '2.0', generator: 'Planish' },
		scene: 0,
		scenes: [{ nodes: [0] }],
		nodes: [
			{
				name: options.title ?? 'surface',
				mesh: 0,
				rotation: TURN[options.up ?? 'z'],
				scale: [scale, scale, scale]
			}
		],
		meshes: [{ name: options.title ?? 'surface', primitives }],
		materials: [{ pbrMetallicRoughness: { metallicFactor: 0.1, roughnessFactor: 0.7 }, doubleSided: true }],
		accessors,
		bufferViews: views,
		buffers: [{ byteLength: size }]
	};
	const text = new TextEncoder().encode(JSON.stringify(json));
	const textSize = Math.ceil(text.length / 4) * 4;
	const out = new Uint8Array(12 + 8 + textSize + 8 + size);
	const view = new DataView(out.buffer);
	[MAGIC, VERSION, out.length, textSize, JSON_CHUNK].forEach((word, k) => view.setUint32(4 * k, word, true));
	// JSON is padded with blanks.
	out.fill(32, 20, 20 + textSize);
	out.set(text, 20);
	view.setUint32(20 + textSize, size, true);
	view.setUint32(24 + textSize, BIN_CHUNK, true);
	let at = 28 + textSize;
	for (const buffer of buffers) {
		out.set(buffer, at);
		at += buffer.length;
	}
	return out;
}
