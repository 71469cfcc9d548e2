import { limitsOf } from './assemble';
import { SURFACE_ENDINGS, detectSurface, toUtf8 } from './detect';
import { empty, shown } from './errors';
import { readObj } from './obj-read';
import { readPly } from './ply-read';
import { readStlSurface } from './stl-surface';
import { plainBytes } from './text';
import type { ReadOptions, SurfaceFile, SurfaceFormat } from './types';
import { unpack } from './unpack';
import { readVtk } from './vtk-read';
import { readVtp } from './vtp-read';

const READERS: Record<SurfaceFormat, (bytes: Uint8Array, options: ReadOptions) => SurfaceFile> = {
	stl: readStlSurface,
	obj: readObj,
	ply: readPly,
	vtk: readVtk,
	vtp: readVtp
};

/**
 * Reads a surface that is not packed; see readSurface.
 * @param bytes the whole file, borrowed
 * @throws MorphError as readSurface
 */
export function parseSurface(bytes: Uint8Array, filename: string, options: ReadOptions = {}): SurfaceFile {
	if (bytes.length === 0)
		throw empty(`"${shown(filename)}" holds no bytes.`, 'Export the surface again and check the upload.');
	const text = toUtf8(plainBytes(bytes));
	const surface = READERS[detectSurface(text.bytes, filename)](text.bytes, options);
	if (text.converted) surface.notes.push({ code: 'encoding', text: 'The text was converted from UTF-16.' });
	surface.filename = filename;
	options.checkpoint?.(1);
	return surface;
}

/**
 * Reads a surface from a file in any of the formats STL, OBJ, PLY, VTK legacy PolyData and VTK XML PolyData, as it is,
 * gzipped, or in a zip with one surface in it. The format is decided by content first, by the name's ending second.
 * @param bytes the whole file, borrowed
 * @throws MorphError file-* for what is wrong with the file, stl-* for an STL: message, place and mend
 */
export async function readSurface(
	bytes: Uint8Array,
	filename: string,
	options: ReadOptions = {}
): Promise<SurfaceFile> {
	const inner = await unpack(bytes, filename, limitsOf(options), SURFACE_ENDINGS, 'surface');
	const surface = parseSurface(inner.bytes, inner.filename, options);
	surface.packing = inner.packing;
	return surface;
}
