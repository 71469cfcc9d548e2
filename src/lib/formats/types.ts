import type { Patch, WithCheckpoint } from '$lib/morph';

export type SurfaceFormat = 'stl' | 'obj' | 'ply' | 'vtk' | 'vtp';

/** How numbers stand in the file; for XML the way of the positions. */
export type FileEncoding =
	'ascii' | 'binary-little-endian' | 'binary-big-endian' | 'base64' | 'base64-zlib' | 'raw' | 'raw-zlib';

export type Packing = 'none' | 'gzip' | 'zip';

/** Something worth knowing that does not stop the reading. The set of codes is closed; `text` is a sentence. */
export interface Note {
	code:
		| 'digits-lost'
		| 'dropped'
		| 'triangulated'
		| 'tail'
		| 'patches-scattered'
		| 'odd-structure'
		| 'strips'
		| 'unused-vertices'
		| 'encoding';
	text: string;
}

/** A named array of a file, for maps. */
export interface NamedArray {
	name: string;
	/** 'cell' arrays have one tuple per polygon as it stands in the file, not per triangle. */
	on: 'point' | 'cell';
	components: number;
	/** Tuples x components, row by row. */
	values: Float64Array;
}

/** Polygons as they came: polygon p has the corners corners[offsets[p]] .. corners[offsets[p + 1] - 1]. */
export interface Polygons {
	/** P + 1 */
	offsets: Uint32Array;
	/** Vertex indices, counter-clockwise from outside. */
	corners: Uint32Array;
}

/** A surface as it stands in a file. Everything keeps the file's order. */
export interface SurfaceFile {
	format: SurfaceFormat;
	encoding: FileEncoding;
	packing: Packing;
	/** The name inside the archive when there is one. */
	filename: string;
	/** N x 3 in the file's unit; never -0. Equal corners are welded for STL only: other formats keep their vertices. */
	positions: Float32Array;
	/** F x 3, the polygons triangulated; the triangles of a polygon follow each other. */
	triangles: Uint32Array;
	/** null when every polygon is a triangle: then polygon i is triangle i. */
	polygons: Polygons | null;
	/** F, ascending: the polygon of each triangle; null like `polygons`. */
	polygonOfTriangle: Uint32Array | null;
	/** Runs of consecutive triangles in file order, covering all; a group that is reopened makes a second run of its name. */
	patches: Patch[];
	/** F attribute words of a binary STL when any is set, else null. */
	attributes: Uint16Array | null;
	arrays: NamedArray[];
	/** Vertices that no polygon uses; they are kept. */
	unusedVertices: number;
	notes: Note[];
}

export interface Limits {
	/** Default 10 million. */
	maxTriangles: number;
	/** Bytes of the file, packed and unpacked; default 2^30. */
	maxBytes: number;
}

export const DEFAULT_LIMITS: Limits = { maxTriangles: 10_000_000, maxBytes: 2 ** 30 };

export interface ReadOptions extends WithCheckpoint {
	limits?: Partial<Limits>;
	/** Whether a file of points without faces is read (for maps) or refused; default 'refuse'. */
	points?: 'refuse' | 'accept';
	/** Name of the cell array that names the patches (PLY, VTK, VTP); default: a few usual names. */
	patchArray?: string;
}
