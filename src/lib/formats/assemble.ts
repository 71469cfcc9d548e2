import type { Patch } from '$lib/morph';
import { empty, tooManyTriangles } from './errors';
import { Triangulator } from './triangulate';
import type { FileEncoding, Limits, NamedArray, Note, ReadOptions, SurfaceFile, SurfaceFormat } from './types';
import { DEFAULT_LIMITS } from './types';

/** More runs than this are no patches but a field: the surface becomes one patch. */
export const MAX_PATCHES = 10_000;

export interface RawSurface {
	format: SurfaceFormat;
	encoding: FileEncoding;
	/** N x 3; owned by the result. */
	positions: Float32Array;
	/** P + 1, rising by at least 3; null: all triangles. */
	offsets: Uint32Array | null;
	/** Valid vertex indices. */
	corners: Uint32Array;
	/** Runs of polygons, rising; the first begins at polygon 0. Runs of one name that follow each other are joined. */
	runs: { name: string; first: number }[];
	arrays: NamedArray[];
	notes: Note[];
}

export const limitsOf = (options: ReadOptions): Limits => ({ ...DEFAULT_LIMITS, ...options.limits });

export function countUnused(vertexCount: number, triangles: Uint32Array): number {
	const used = new Uint8Array(vertexCount);
	for (let i = 0; i < triangles.length; i++) used[triangles[i]] = 1;
	let count = 0;
	for (let v = 0; v < vertexCount; v++) if (!used[v]) count++;
	return count;
}

/** Splits the polygons, forms the patches and counts what is left over. */
export function assemble(raw: RawSurface, options: ReadOptions): SurfaceFile {
	const { positions, corners, notes } = raw;
	const limits = limitsOf(options);
	const polygonCount = raw.offsets ? raw.offsets.length - 1 : corners.length / 3;
	if (polygonCount === 0 && options.points !== 'accept') {
		throw empty(
			positions.length === 0
				? 'The file holds no points and no faces.'
				: `The file holds ${positions.length / 3} points but no faces: it is a cloud of points, not a surface.`,
			'Give a surface with faces: reconstruct one from the points, or choose it in the export.'
		);
	}
	let offsets = raw.offsets;
	if (offsets && corners.length === 3 * polygonCount) offsets = null;
	const triangleCount = corners.length - 2 * polygonCount;
	if (triangleCount > limits.maxTriangles) throw tooManyTriangles(triangleCount, limits);
	let triangles = corners;
	let polygonOfTriangle: Uint32Array | null = null;
	if (offsets) {
		triangles = new Uint32Array(3 * triangleCount);
		polygonOfTriangle = new Uint32Array(triangleCount);
		const splitter = new Triangulator(positions);
		let at = 0;
		for (let p = 0; p < polygonCount; p++) {
			const n = offsets[p + 1] - offsets[p];
			splitter.split(corners, offsets[p], offsets[p + 1], triangles, 3 * at, p);
			polygonOfTriangle.fill(p, at, at + n - 2);
			at += n - 2;
			if (options.checkpoint && p % 65536 === 0) options.checkpoint(0.8 + (0.2 * p) / polygonCount);
		}
		const odd = splitter.odd > 0 ? `, ${splitter.odd} of them crossing themselves or without area` : '';
		notes.push({
			code: 'triangulated',
			text: `${polygonCount} polygons were split into ${triangleCount} triangles; ${splitter.clipped} are not convex${odd}.`
		});
	}
	const unusedVertices = countUnused(positions.length / 3, triangles);
	if (unusedVertices > 0 && polygonCount > 0) {
		notes.push({ code: 'unused-vertices', text: `${unusedVertices} vertices belong to no face; they are kept.` });
	}
	return {
		format: raw.format,
		encoding: raw.encoding,
		packing: 'none',
		filename: '',
		positions,
		triangles,
		polygons: offsets ? { offsets, corners } : null,
		polygonOfTriangle,
		patches: patchesOf(raw.runs, polygonCount, offsets, triangleCount, notes),
		attributes: null,
		arrays: raw.arrays,
		unusedVertices,
		notes
	};
}

function patchesOf(
	runs: RawSurface['runs'],
	polygonCount: number,
	offsets: Uint32Array | null,
	triangleCount: number,
	notes: Note[]
): Patch[] {
	const firstTriangle = (polygon: number) => (offsets ? offsets[polygon] - 2 * polygon : polygon);
	const patches: Patch[] = [];
	runs.forEach((run, k) => {
		const end = k + 1 < runs.length ? runs[k + 1].first : polygonCount;
		// A group that was named but never filled is no patch.
		if (end <= run.first) return;
		const last = patches[patches.length - 1];
		const count = firstTriangle(end) - firstTriangle(run.first);
		if (last && last.name === run.name) last.triangleCount += count;
		else patches.push({ name: run.name, firstTriangle: firstTriangle(run.first), triangleCount: count });
	});
	if (patches.length > MAX_PATCHES) {
		notes.push({
			code: 'patches-scattered',
			text: `The groups change ${patches.length} times along the file; the surface is read as one patch.`
		});
		patches.length = 0;
	}
	if (patches.length === 0) return [{ name: '', firstTriangle: 0, triangleCount }];
	return patches;
}

/** Runs of a whole number per polygon, named `${label} ${number}` or by `names`. */
export function runsOfCells(
	values: ArrayLike<number>,
	label: string,
	names: Map<number, string> | null
): RawSurface['runs'] {
	const runs: RawSurface['runs'] = [];
	for (let p = 0; p < values.length; p++) {
		if (p > 0 && values[p] === values[p - 1]) continue;
		runs.push({ name: names?.get(values[p]) ?? `${label} ${values[p]}`, first: p });
		if (runs.length > MAX_PATCHES + 1) break;
	}
	return runs;
}

const USUAL_PATCH_ARRAYS =
	/^(patch|patches|patch_?id|region|region_?id|regions|zone|zone_?id|part|part_?id|group|group_?id|solid|solid_?id|boundary|boundary_?id|component_?id|marker|surface_?id|cellentityids|stlsolidlabeling)$/i;
const MAX_CELL_PATCHES = 1000;

/** The cell array that names the patches: the one asked for, or one of a usual name that holds few whole numbers. */
export function patchArray(arrays: NamedArray[], wanted: string | undefined): NamedArray | null {
	const scalar = arrays.filter((a) => a.on === 'cell' && a.components === 1 && a.values.length > 0);
	if (wanted !== undefined) return scalar.find((a) => a.name === wanted) ?? null;
	return (
		scalar.find((a) => {
			if (!USUAL_PATCH_ARRAYS.test(a.name)) return false;
			const seen = new Set<number>();
			for (const value of a.values) {
				if (!Number.isInteger(value)) return false;
				seen.add(value);
				if (seen.size > MAX_CELL_PATCHES) return false;
			}
			return true;
		}) ?? null
	);
}

/** float32 copy of positions without -0, with a note when a value lost digits. Finite values are the caller's to check. */
export function toPositions(values: ArrayLike<number>, exactInFile: boolean, notes: Note[]): Float32Array {
	const out = new Float32Array(values.length);
	let worst = 0;
	for (let i = 0; i < out.length; i++) {
		const value = values[i];
		// A value too small for 32 bits becomes -0, too.
		out[i] = Math.fround(value) + 0;
		const lost = Math.abs(value - out[i]);
		if (lost > worst) worst = lost;
	}
	if (worst > 0 && exactInFile) notes.push(digitsLost(worst));
	return out;
}

export const digitsLost = (worst: number): Note => ({
	code: 'digits-lost',
	text: `The file has more digits than 32-bit numbers hold: coordinates changed by at most ${worst.toPrecision(2)} units.`
});

/** The most significant digits that a decimal may have and still have been written for a float32 (IEEE 754-2019, 5.12.2). */
export const FLOAT32_DIGITS = 9;
