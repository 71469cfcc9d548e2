/** Writes a shape as a file, piece by piece, as fast as the other end takes the pieces. */
import { createHash } from 'node:crypto';
import { Readable } from 'node:stream';
import type { MessagePort } from 'node:worker_threads';
import JSZip from 'jszip';
import { objChunks } from '$lib/formats/obj-write';
import { plyChunks } from '$lib/formats/ply-write';
import type { NamedArray } from '$lib/formats/types';
import { vtpChunks } from '$lib/formats/vtp-write';
import { displayDensity, makeSurface, stlChunks, toMetres, writeStl } from '$lib/morph';
import { AppError } from '../../errors';
import { findMap, findShape, findStudy, type ShapeRow } from '../../repositories/shapes';
import { listObjectives } from '../../repositories/studies';
import { metresPerUnit, readGradient, readMesh } from '../../services/mesh-cache';
import { handoverText } from '../../services/handover';
import type { Control } from '../control';
import type { FileRequest } from '../protocol';

/** Small pieces: the server copies each to its socket between other requests. */
const CHUNK_TRIANGLES = 8192;
const DENSITY_PIECE = 1 << 18;

/** @throws AppError, Stopped */
export async function fileTask(file: FileRequest, port: MessagePort, control: Control): Promise<void> {
	control.stage('Writing the file', 0, 1);
	const pulls = new Pulls(port);
	try {
		for await (const piece of pieces(file)) {
			if (!(await pulls.next())) return;
			control.check();
			// Copied when it is a view of something larger: only a buffer of its own can be handed over.
			const own = piece.byteLength === piece.buffer.byteLength ? piece : piece.slice();
			port.postMessage(own, [own.buffer as ArrayBuffer]);
		}
		if (await pulls.next()) port.postMessage(null);
	} finally {
		port.close();
	}
}

function pieces(file: FileRequest): AsyncGenerator<Uint8Array> {
	switch (file.format) {
		case 'stl':
			return stl(file);
		case 'obj':
		case 'ply':
		case 'vtp':
			return mesh(file);
		case 'handover':
			return handover(file);
		case 'density':
			return density(file);
	}
}

/** The other end asks for each piece by a message, so that no more than one waits. */
class Pulls {
	#asked = 0;
	#closed = false;
	#ring = () => {};

	constructor(port: MessagePort) {
		port.on('message', () => {
			this.#asked++;
			this.#ring();
		});
		port.on('close', () => {
			this.#closed = true;
			this.#ring();
		});
	}

	/** @returns false when the other end is gone */
	async next(): Promise<boolean> {
		while (this.#asked === 0 && !this.#closed) await new Promise<void>((resolve) => (this.#ring = resolve));
		this.#asked--;
		return !this.#closed;
	}
}

async function load(shapeId: string) {
	const shape = await findShape(shapeId);
	if (!shape) throw new AppError('not-found', 'There is no such shape.');
	return { shape, mesh: await readMesh(shape) };
}

async function* stl({ shapeId, encoding }: Extract<FileRequest, { format: 'stl' }>): AsyncGenerator<Uint8Array> {
	const { mesh } = await load(shapeId);
	yield* stlChunks(mesh, { encoding, chunkTriangles: CHUNK_TRIANGLES });
}

const WRITERS = { obj: objChunks, ply: plyChunks, vtp: vtpChunks };

async function* mesh({
	shapeId,
	format
}: Extract<FileRequest, { format: keyof typeof WRITERS }>): AsyncGenerator<Uint8Array> {
	const { shape, mesh } = await load(shapeId);
	const { positions, triangles, patches } = mesh;
	const title = `${shape.name}, shape ${shape.number}`;
	yield* WRITERS[format]({ positions, triangles, patches, arrays: await displacement(shape, positions) }, { title });
}

/** How far each vertex went from the parent, in the study's length unit; nothing for a shape that was uploaded. */
async function displacement(shape: ShapeRow, positions: Float32Array): Promise<NamedArray[]> {
	const parent = shape.parentId ? await findShape(shape.parentId) : null;
	if (!parent || parent.topologyId !== shape.topologyId) return [];
	const before = (await readMesh(parent)).positions;
	const values = Float64Array.from(positions, (x, i) => x - before[i]);
	return [{ name: 'displacement', on: 'point', components: 3, values }];
}

async function* handover({
	shapeId,
	stlName
}: Extract<FileRequest, { format: 'handover' }>): AsyncGenerator<Uint8Array> {
	const { shape, mesh } = await load(shapeId);
	const [study, objectives, parent] = await Promise.all([
		findStudy(shape.studyId),
		listObjectives(shape.studyId),
		shape.parentId ? findShape(shape.parentId) : null
	]);
	const bytes = writeStl(mesh);
	const sha256 = createHash('sha256').update(bytes).digest('hex');
	const zip = new JSZip();
	// One date in all entries, so that the same shape gives the same zip.
	const date = shape.createdAt;
	// Binary coordinates hardly compress; words do.
	const compression = mesh.encoding === 'binary' ? 'STORE' : 'DEFLATE';
	zip.file(stlName, bytes, { date, compression });
	if (shape.move) zip.file('recipe.json', `${JSON.stringify(shape.move.recipe, null, '\t')}\n`, { date });
	const text = handoverText({
		study: study!,
		objectives,
		shape,
		parent,
		stl: { name: stlName, sha256, encoding: mesh.encoding }
	});
	zip.file('README.txt', text, { date });
	const stream = zip.generateNodeStream({
		compression: 'DEFLATE',
		compressionOptions: { level: 1 }
	});
	// jszip's stream is of an older kind, which cannot be iterated.
	yield* new Readable().wrap(stream);
}

async function* density({ mapId }: Extract<FileRequest, { format: 'density' }>): AsyncGenerator<Uint8Array> {
	const map = await findMap(mapId);
	if (!map) throw new AppError('not-found', 'There is no such map.');
	const { shape, mesh } = await load(map.shapeId);
	const metres = await metresPerUnit(shape.studyId);
	const surface = makeSurface(toMetres(mesh.positions, metres), mesh.triangles);
	const values = displayDensity(await readGradient(map, surface), surface);
	const bytes = new Uint8Array(values.buffer);
	for (let at = 0; at < bytes.length; at += DENSITY_PIECE) yield bytes.subarray(at, at + DENSITY_PIECE);
}
