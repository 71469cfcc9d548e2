import { assemble, limitsOf, patchArray, runsOfCells, toPositions } from './assemble';
import { nonFinite, syntax, tooManyTriangles } from './errors';
import { GrowingIndices } from './growing';
import type { NumberArray } from './scalars';
import type { FileEncoding, NamedArray, Note, ReadOptions, SurfaceFile } from './types';

/** Cells of one kind: cell c has the points connectivity[offsets[c]] .. connectivity[offsets[c + 1] - 1]. */
export interface CellBlock {
	/** Count + 1. */
	offsets: NumberArray;
	connectivity: NumberArray;
	/** Where the block stands in the file. */
	byte: number;
}

/** A vtkPolyData as it stands in a file, legacy or XML. Cell arrays run over vertices, lines, polygons, strips. */
export interface PolyData {
	format: 'vtk' | 'vtp';
	encoding: FileEncoding;
	/** N x 3 */
	points: NumberArray;
	/** Whether the file's points hold exactly what stands here (binary), or decimals that were rounded. */
	pointsExact: boolean;
	pointsByte: number;
	vertexCells: number;
	lineCells: number;
	polys: CellBlock | null;
	strips: CellBlock | null;
	arrays: NamedArray[];
	patchNames: Map<number, string> | null;
	notes: Note[];
}

export const cellCount = (block: CellBlock | null | undefined) => (block ? Math.max(0, block.offsets.length - 1) : 0);

/** Refuses offsets that fall, and points that do not exist. */
function checkBlock(block: CellBlock, what: string, least: number, pointCount: number): void {
	const { offsets, connectivity, byte } = block;
	const cells = cellCount(block);
	const fault = (cell: number, text: string) => syntax(`${what} ${cell} ${text}`, { byte, triangle: cell });
	if (cells > 0 && offsets[0] !== 0) throw fault(0, `begins at ${offsets[0]} instead of 0.`);
	for (let c = 0; c < cells; c++) {
		const n = offsets[c + 1] - offsets[c];
		if (!Number.isInteger(n) || offsets[c + 1] > connectivity.length) {
			throw fault(c, `ends at ${offsets[c + 1]}, but there are ${connectivity.length} corners in all.`);
		}
		if (n < least) throw fault(c, `has ${n} corners; at least ${least} are needed.`);
	}
	for (let i = 0; i < connectivity.length; i++) {
		const point = connectivity[i];
		if (point >= 0 && point < pointCount && Number.isInteger(point)) continue;
		let cell = 0;
		while (cell + 1 < cells && offsets[cell + 1] <= i) cell++;
		throw fault(cell, `names point ${point}, but the file has ${pointCount} points.`);
	}
}

/** Turns the polygons and strips of a PolyData into a surface; vertices and lines are left out and said so. */
export function surfaceOf(data: PolyData, options: ReadOptions): SurfaceFile {
	const { points, notes } = data;
	for (let i = 0; i < points.length; i++) {
		if (Number.isFinite(Math.fround(points[i]))) continue;
		const vertex = Math.floor(i / 3);
		throw nonFinite(`Coordinate ${'xyz'[i % 3]} of point ${vertex} is not a finite 32-bit number.`, {
			vertex,
			byte: data.pointsByte
		});
	}
	const pointCount = points.length / 3;
	const limits = limitsOf(options);
	const polyCount = cellCount(data.polys);
	const stripCount = cellCount(data.strips);
	if (data.polys) checkBlock(data.polys, 'Polygon', 3, pointCount);
	if (data.strips) checkBlock(data.strips, 'Triangle strip', 3, pointCount);
	if (polyCount > limits.maxTriangles) throw tooManyTriangles(polyCount, limits, data.polys?.byte);

	let offsets: Uint32Array;
	let corners: Uint32Array;
	/** Strip of each triangle behind the polygons. */
	let stripOf: Uint32Array | null = null;
	if (data.strips && stripCount > 0) {
		const grownOffsets = new GrowingIndices(polyCount + data.strips.connectivity.length);
		const grownCorners = new GrowingIndices(
			(data.polys?.connectivity.length ?? 0) + 3 * data.strips.connectivity.length
		);
		const made = new GrowingIndices(data.strips.connectivity.length);
		if (data.polys) {
			for (let c = 0; c < polyCount; c++) grownOffsets.push(data.polys.offsets[c]);
			for (let i = 0; i < data.polys.offsets[polyCount]; i++) grownCorners.push(data.polys.connectivity[i]);
		}
		grownOffsets.push(grownCorners.length);
		const { offsets: at, connectivity } = data.strips;
		for (let s = 0; s < stripCount; s++) {
			for (let i = at[s] + 2; i < at[s + 1]; i++) {
				// Every second triangle of a strip is turned.
				const odd = (i - at[s]) % 2;
				grownCorners.push(connectivity[i - 2 + odd]);
				grownCorners.push(connectivity[i - 1 - odd]);
				grownCorners.push(connectivity[i]);
				grownOffsets.push(grownCorners.length);
				made.push(s);
			}
		}
		offsets = grownOffsets.take();
		corners = grownCorners.take();
		stripOf = made.take();
		notes.push({ code: 'strips', text: `${stripCount} triangle strips were read as ${stripOf.length} triangles.` });
	} else if (data.polys) {
		offsets = Uint32Array.from(data.polys.offsets);
		corners = Uint32Array.from(data.polys.connectivity.subarray(0, offsets[polyCount] ?? 0));
	} else {
		offsets = new Uint32Array(1);
		corners = new Uint32Array(0);
	}
	if (offsets.length === 0) offsets = new Uint32Array(1);
	const skipped = data.vertexCells + data.lineCells;
	if (skipped > 0) {
		notes.push({
			code: 'dropped',
			text: `${data.vertexCells} vertex cells and ${data.lineCells} lines are no part of the surface and were left out.`
		});
	}
	const arrays = data.arrays.map((array) =>
		array.on === 'cell' ? polygonArray(array, skipped, polyCount, stripOf) : array
	);
	const patches = patchArray(arrays, options.patchArray);
	return assemble(
		{
			format: data.format,
			encoding: data.encoding,
			positions: toPositions(points, data.pointsExact, notes),
			offsets,
			corners,
			runs: patches ? runsOfCells(patches.values, patches.name, data.patchNames) : [],
			arrays,
			notes
		},
		options
	);
}

/** The part of a cell array that belongs to polygons, and to strips by their triangles. */
function polygonArray(array: NamedArray, skipped: number, polyCount: number, stripOf: Uint32Array | null): NamedArray {
	const { components: n, values } = array;
	if (!stripOf) {
		if (skipped === 0 && values.length === n * polyCount) return array;
		return { ...array, values: values.slice(n * skipped, n * (skipped + polyCount)) };
	}
	const out = new Float64Array(n * (polyCount + stripOf.length));
	out.set(values.subarray(n * skipped, n * (skipped + polyCount)));
	for (let t = 0; t < stripOf.length; t++) {
		for (let c = 0; c < n; c++) out[n * (polyCount + t) + c] = values[n * (skipped + polyCount + stripOf[t]) + c];
	}
	return { ...array, values: out };
}
