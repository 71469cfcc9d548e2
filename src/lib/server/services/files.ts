/** Files of shapes: what is stored, as it is; what is made from it, made in a worker thread while it is sent. */
import { MessageChannel, type MessagePort } from 'node:worker_threads';
import { contentInfo, readContent, type StoredContent } from '../content/store';
import { AppError } from '../errors';
import { Control } from '../jobs/control';
import type { FileRequest } from '../jobs/protocol';
import { jobsRuntime } from '../jobs/runtime';
import { findMap, findRootFilename, findTopology } from '../repositories/shapes';
import { keepOutContents } from './keep-outs';
import { requireShape } from './shapes';

export interface FileAnswer {
	/** Names the bytes for ever: they never change. */
	etag: string;
	/** Bytes, where known before they are made. */
	size?: number;
	/** undefined: to be shown, not saved. */
	filename?: string;
	type: string;
	/** Call once. */
	bytes(): AsyncIterable<Uint8Array>;
}

const BYTES = 'application/octet-stream';
const STL = 'model/stl';

function stored({ id, size, sha256 }: StoredContent, more: Pick<FileAnswer, 'filename' | 'type'>): FileAnswer {
	return { etag: `"${sha256}"`, size, ...more, bytes: () => readContent(id) };
}

/** Vertices, float32 x, y, z little-endian in the study's unit. */
export async function positionsFile(shapeId: string): Promise<FileAnswer> {
	const { positionsId } = await requireShape(shapeId);
	return stored(await contentInfo(positionsId), { type: BYTES });
}

/** Triangles, three uint32 little-endian each. */
export async function trianglesFile(topologyId: string): Promise<FileAnswer> {
	const topology = await findTopology(topologyId);
	if (!topology) throw new AppError('not-found', 'There is no such mesh.');
	return stored(await contentInfo(topology.trianglesId), { type: BYTES });
}

/**
 * The surface of an uploaded keep-out: uint32 numbers of vertices and of triangles, float32 x, y, z of each vertex in the
 * study's length unit, uint32 corners; little-endian.
 *
 * @throws AppError not-found
 */
export async function keepOutMeshFile(keepOutId: string): Promise<FileAnswer> {
	const { positionsId, trianglesId } = await keepOutContents(keepOutId);
	const [positions, triangles] = await Promise.all([contentInfo(positionsId), contentInfo(trianglesId)]);
	const head = new Uint8Array(new Uint32Array([positions.size / 12, triangles.size / 12]).buffer);
	return {
		etag: `"keep-out-${keepOutId}"`,
		size: head.length + positions.size + triangles.size,
		type: BYTES,
		async *bytes() {
			yield head;
			yield* readContent(positionsId);
			yield* readContent(trianglesId);
		}
	};
}

/** @throws AppError not-found when the shape was not uploaded but made by a move */
export async function originalFile(shapeId: string): Promise<FileAnswer> {
	const { originalId, filename, number } = await requireShape(shapeId);
	if (!originalId) {
		throw new AppError('not-found', `Shape ${number} was made by a move: it has no upload.`, {
			mend: 'Take its STL from files/stl.'
		});
	}
	return stored(await contentInfo(originalId), { type: BYTES, filename: filename ?? undefined });
}

/** touring-pod-430-shape-3: the uploaded file's name and the shape's number. */
async function baseName(shapeId: string, number: number): Promise<string> {
	const stem = ((await findRootFilename(shapeId)) ?? 'shape').replace(/\.[^.]*$/, '');
	const plain = stem.replace(/[^\p{L}\p{N}._-]+/gu, '-').replace(/^[-.]+|-+$/g, '');
	return `${plain || 'surface'}-shape-${number}`;
}

/** @param encoding default: as it was uploaded */
export async function stlFile(shapeId: string, encoding?: 'binary' | 'ascii'): Promise<FileAnswer> {
	const shape = await requireShape(shapeId);
	const chosen = encoding ?? shape.topology!.encoding;
	const size = chosen === 'binary' ? 84 + 50 * shape.topology!.triangleCount : undefined;
	return {
		etag: `"stl-${chosen}-${shapeId}"`,
		size,
		type: STL,
		filename: `${await baseName(shapeId, shape.number)}.stl`,
		bytes: () => made({ format: 'stl', shapeId, encoding: chosen })
	};
}

const MESH_TYPES = { obj: 'model/obj', ply: 'application/octet-stream', vtp: 'application/xml' };

/** The shape in another format, with its patches; VTP and PLY carry the displacement from the parent as an array. */
export async function meshFile(shapeId: string, format: keyof typeof MESH_TYPES): Promise<FileAnswer> {
	const { number } = await requireShape(shapeId);
	return {
		etag: `"${format}-${shapeId}"`,
		type: MESH_TYPES[format],
		filename: `${await baseName(shapeId, number)}.${format}`,
		bytes: () => made({ format, shapeId })
	};
}

/** The STL, the recipe and a readable account of the move. */
export async function handoverFile(shapeId: string): Promise<FileAnswer> {
	const shape = await requireShape(shapeId);
	const base = await baseName(shapeId, shape.number);
	return {
		etag: `"handover-${shapeId}"`,
		type: 'application/zip',
		filename: `${base}.zip`,
		bytes: () => made({ format: 'handover', shapeId, stlName: `${base}.stl` })
	};
}

/** A map as a density at vertices for display: float32 little-endian, per metre outward per square metre. */
export async function densityFile(mapId: string): Promise<FileAnswer> {
	const map = await findMap(mapId);
	if (!map) throw new AppError('not-found', 'There is no such map.');
	const { topology } = await requireShape(map.shapeId);
	return {
		etag: `"density-${mapId}"`,
		size: 4 * topology!.vertexCount,
		type: BYTES,
		bytes: () => made({ format: 'density', mapId })
	};
}

/** Pieces from a worker thread, each asked for when the one before is taken. */
async function* made(file: FileRequest): AsyncGenerator<Uint8Array> {
	const { port1, port2 } = new MessageChannel();
	const control = new Control();
	const pieces = new Pieces(port1);
	const ended = jobsRuntime()
		.files.run({ kind: 'file', file, port: port2, control: control.buffer })
		.then((outcome) => {
			if (outcome.outcome !== 'refused') return;
			const { code, detail, options } = outcome.refusal;
			throw new AppError(code, detail, options);
		});
	ended.then(
		() => pieces.end(null),
		(error: unknown) => pieces.end(error)
	);
	try {
		for (let piece = await pieces.next(); piece; piece = await pieces.next()) yield piece;
	} finally {
		control.stop('cancelled');
		port1.close();
	}
}

class Pieces {
	readonly #arrived: (Uint8Array | null)[] = [];
	#failure: { error: unknown } | null = null;
	#ring = () => {};

	constructor(readonly port: MessagePort) {
		port.on('message', (piece: Uint8Array | null) => {
			this.#arrived.push(piece);
			this.#ring();
		});
	}

	/** The thread is through: with an error, or with everything sent. */
	end(error: unknown): void {
		// What was sent before is still on its way through the port; the null that ends it too.
		if (error !== null) this.#failure = { error };
		this.#ring();
	}

	/** @returns null at the end */
	async next(): Promise<Uint8Array | null> {
		this.port.postMessage(0);
		while (this.#arrived.length === 0) {
			if (this.#failure) throw this.#failure.error;
			await new Promise<void>((resolve) => (this.#ring = resolve));
		}
		return this.#arrived.shift()!;
	}
}
