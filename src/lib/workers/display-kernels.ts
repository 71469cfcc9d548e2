/** Display arithmetic on typed arrays. Nothing here is stored or exported: float32 is enough for the eye. */
import type { FieldSpread, Vec3 } from './display-protocol';

const ROBUST_SHARE = 0.98;
/** Past this many vertices the percentile is taken over an even sample. */
const SAMPLE = 60_000;

/** float32 positions in a file's unit (n x 3, borrowed) in metres. */
export function scaled(positions: Float32Array, metresPerUnit: number): Float32Array {
	const out = new Float32Array(positions.length);
	for (let i = 0; i < out.length; i++) out[i] = positions[i] * metresPerUnit;
	return out;
}

/**
 * Unit vertex normals weighted by area (n x 3) and, when `areas` (n) is given, a third of the area of the triangles at each
 * vertex in it. (0,0,0) where a vertex has no area. `positions` n x 3, `triangles` f x 3, both borrowed.
 */
export function vertexNormals(positions: Float32Array, triangles: Uint32Array, areas?: Float32Array): Float32Array {
	const normals = new Float32Array(positions.length);
	for (let t = 0; t < triangles.length; t += 3) {
		const va = triangles[t];
		const vb = triangles[t + 1];
		const vc = triangles[t + 2];
		const a = 3 * va;
		const b = 3 * vb;
		const c = 3 * vc;
		const ux = positions[b] - positions[a];
		const uy = positions[b + 1] - positions[a + 1];
		const uz = positions[b + 2] - positions[a + 2];
		const wx = positions[c] - positions[a];
		const wy = positions[c + 1] - positions[a + 1];
		const wz = positions[c + 2] - positions[a + 2];
		const x = uy * wz - uz * wy;
		const y = uz * wx - ux * wz;
		const z = ux * wy - uy * wx;
		normals[a] += x;
		normals[a + 1] += y;
		normals[a + 2] += z;
		normals[b] += x;
		normals[b + 1] += y;
		normals[b + 2] += z;
		normals[c] += x;
		normals[c + 1] += y;
		normals[c + 2] += z;
		if (areas) {
			const third = Math.sqrt(x * x + y * y + z * z) / 6;
			areas[va] += third;
			areas[vb] += third;
			areas[vc] += third;
		}
	}
	for (let i = 0; i < normals.length; i += 3) {
		const x = normals[i];
		const y = normals[i + 1];
		const z = normals[i + 2];
		const length = Math.sqrt(x * x + y * y + z * z);
		if (length > 0) {
			normals[i] = x / length;
			normals[i + 1] = y / length;
			normals[i + 2] = z / length;
		}
	}
	return normals;
}

export function boundsOf(positions: Float32Array): { min: Vec3; max: Vec3 } {
	const min: Vec3 = [Infinity, Infinity, Infinity];
	const max: Vec3 = [-Infinity, -Infinity, -Infinity];
	for (let i = 0; i < positions.length; i += 3) {
		for (let k = 0; k < 3; k++) {
			const x = positions[i + k];
			if (x < min[k]) min[k] = x;
			if (x > max[k]) max[k] = x;
		}
	}
	return { min, max };
}

/**
 * `values` (n) averaged over the neighbours along edges, `passes` times; noise at single vertices goes, the large picture stays.
 * @param triangles f x 3, borrowed
 */
export function averaged(values: Float32Array, triangles: Uint32Array, passes: number): Float32Array {
	const degree = new Float32Array(values.length);
	for (const v of triangles) degree[v] += 2;
	let from = values.slice();
	let to = new Float32Array(values.length);
	for (let pass = 0; pass < passes; pass++) {
		to.fill(0);
		for (let t = 0; t < triangles.length; t += 3) {
			const a = triangles[t];
			const b = triangles[t + 1];
			const c = triangles[t + 2];
			const sum = from[a] + from[b] + from[c];
			to[a] += sum - from[a];
			to[b] += sum - from[b];
			to[c] += sum - from[c];
		}
		for (let v = 0; v < to.length; v++) to[v] = degree[v] > 0 ? 0.5 * from[v] + (0.5 * to[v]) / degree[v] : from[v];
		[from, to] = [to, from];
	}
	return from;
}

/** Extremes of `values` (n) and the |value| below which 98 % of the area (`areas`, n) lies. */
export function spreadOf(values: Float32Array, areas: Float32Array): FieldSpread {
	let min = Infinity;
	let max = -Infinity;
	for (const v of values) {
		if (v < min) min = v;
		if (v > max) max = v;
	}
	if (values.length === 0) return { min: 0, max: 0, robust: 0 };
	const stride = Math.max(1, Math.floor(values.length / SAMPLE));
	const order: number[] = [];
	let total = 0;
	for (let i = 0; i < values.length; i += stride) {
		// A field that lives in a part of the surface only is judged there.
		if (values[i] === 0) continue;
		order.push(i);
		total += areas[i];
	}
	order.sort((p, q) => Math.abs(values[p]) - Math.abs(values[q]));
	let sum = 0;
	for (const i of order) {
		sum += areas[i];
		if (sum >= ROBUST_SHARE * total) return { min, max, robust: Math.abs(values[i]) };
	}
	return { min, max, robust: 0 };
}

/** Area in each of `bins` equal bins over [-extent, extent], as shares of the area there; what lies beyond is left out. */
export function histogramOf(values: Float32Array, areas: Float32Array, extent: number, bins: number): Float32Array {
	const out = new Float32Array(bins);
	if (!(extent > 0)) return out;
	let total = 0;
	for (let i = 0; i < values.length; i++) {
		if (values[i] === 0 || Math.abs(values[i]) > extent) continue;
		out[Math.min(bins - 1, Math.floor(((values[i] / extent + 1) / 2) * bins))] += areas[i];
		total += areas[i];
	}
	if (total > 0) for (let b = 0; b < bins; b++) out[b] /= total;
	return out;
}

/** a times b, vertex by vertex; both n, borrowed. */
export function product(a: Float32Array, b: Float32Array): Float32Array {
	return a.map((x, v) => x * b[v]);
}

/** (to - from) . normals at each vertex, times `scale`. All borrowed, n x 3. */
export function along(normals: Float32Array, from: Float32Array, to: Float32Array, scale: number): Float32Array {
	const out = new Float32Array(normals.length / 3);
	for (let v = 0, i = 0; v < out.length; v++, i += 3) {
		out[v] =
			scale *
			((to[i] - from[i]) * normals[i] +
				(to[i + 1] - from[i + 1]) * normals[i + 1] +
				(to[i + 2] - from[i + 2]) * normals[i + 2]);
	}
	return out;
}
