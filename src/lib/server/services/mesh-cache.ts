/** What a worker thread reads of shapes and maps to work on them, and what it keeps for the next time. */
import {
	makeSurface,
	nodalGradient,
	prepareMove,
	toMetres,
	type Checkpoint,
	type DesignBox,
	type Mesh,
	type PreparedMove,
	type Surface,
	type SymmetryPlane
} from '$lib/morph';
import type { Recipe } from '$lib/api/schemas/moves';
import { readWhole } from '../content/store';
import { AppError } from '../errors';
import { findMaps, findStudy, type MapRow, type ShapeRow } from '../repositories/shapes';
import { weightsOf } from './lock-weights';
import { METRES } from './recipe';

/** Keeps the values that were used last, as long as their bytes fit. A value is not kept when the making of it fails. */
class Kept {
	readonly #values = new Map<string, { value: unknown; bytes: number }>();
	#bytes = 0;

	constructor(readonly limit: number) {}

	async get<T>(key: string, make: () => Promise<T> | T, bytesOf: (value: T) => number): Promise<T> {
		const found = this.#values.get(key);
		if (found) {
			this.#values.delete(key);
			this.#values.set(key, found);
			return found.value as T;
		}
		const value = await make();
		const bytes = bytesOf(value);
		this.#values.set(key, { value, bytes });
		this.#bytes += bytes;
		for (const [oldest, { bytes: freed }] of this.#values) {
			if (this.#bytes <= this.limit || oldest === key) break;
			this.#values.delete(oldest);
			this.#bytes -= freed;
		}
		return value;
	}
}

/** Vertices and triangles of a shape as stored. */
export async function readMesh(shape: ShapeRow): Promise<Mesh> {
	const topology = shape.topology!;
	const [positions, triangles, attributes] = await Promise.all([
		readWhole(shape.positionsId),
		readWhole(topology.trianglesId),
		topology.attributesId ? readWhole(topology.attributesId) : null
	]);
	return {
		positions: new Float32Array(positions.buffer),
		triangles: new Uint32Array(triangles.buffer),
		patches: topology.patches,
		attributes: attributes && new Uint16Array(attributes.buffer),
		encoding: topology.encoding
	};
}

export async function metresPerUnit(studyId: string): Promise<number> {
	const study = await findStudy(studyId);
	if (!study) throw new AppError('not-found', 'There is no such study.');
	return METRES[study.lengthUnit];
}

/** A shape ready to be moved. Borrowed from the cache: not to be changed. */
export interface LoadedShape {
	id: string;
	mesh: Mesh;
	surface: Surface;
	metresPerUnit: number;
}

const surfaceBytes = ({ positions, triangles }: Surface) => 4 * positions.byteLength + triangles.byteLength;

export class MeshCache {
	readonly #kept: Kept;

	/** @param limit bytes of arrays that are kept (nearly: by their main parts); 0 keeps the last thing only */
	constructor(limit: number) {
		this.#kept = new Kept(limit);
	}

	/** Anything else that is worth keeping. @param bytes about */
	kept<T>(key: string, make: () => Promise<T> | T, bytes: number): Promise<T> {
		return this.#kept.get(key, make, () => bytes);
	}

	/**
	 * @param shape with its topology
	 * @param symmetry of a half model, which then counts as closed by its plane
	 */
	shape(shape: ShapeRow, symmetry: SymmetryPlane | null, checkpoint?: Checkpoint): Promise<LoadedShape> {
		const make = async () => {
			const [mesh, metres] = await Promise.all([readMesh(shape), metresPerUnit(shape.studyId)]);
			checkpoint?.(0.5);
			const options = { checkpoint, symmetry: symmetry ?? undefined };
			const surface = makeSurface(toMetres(mesh.positions, metres), mesh.triangles, options);
			return { id: shape.id, mesh, surface, metresPerUnit: metres };
		};
		return this.#kept.get(`shape ${shape.id} ${JSON.stringify(symmetry)}`, make, (loaded) =>
			surfaceBytes(loaded.surface)
		);
	}

	/**
	 * The gradient of each objective that has maps in the recipe: its maps by their shares. The same array again for the same maps,
	 * since the engine recognises gradients by identity.
	 *
	 * @returns by objective, N x 3, per metre
	 */
	async gradients(recipe: Recipe, surface: Surface): Promise<Map<string, Float64Array>> {
		const byObjective = new Map<string, MapRow[]>();
		const rows = new Map((await findMaps(recipe.mapIds)).map((row) => [row.id, row]));
		for (const mapId of recipe.mapIds) {
			const row = rows.get(mapId);
			if (!row) throw new AppError('no-map', `The recipe’s map ${mapId} is not there.`);
			byObjective.set(row.objectiveId, [...(byObjective.get(row.objectiveId) ?? []), row]);
		}
		const gradients = new Map<string, Float64Array>();
		for (const [objectiveId, maps] of byObjective) {
			const shares = maps.map((map) => ({ map, share: recipe.mapWeights[map.id] }));
			const key = `gradient ${shares.map(({ map, share }) => `${map.id}*${share}`).join('+')}`;
			const make = async () => {
				const sum = new Float64Array(surface.positions.length);
				for (const { map, share } of shares) {
					const gradient = await readGradient(map, surface);
					if (shares.length === 1) return gradient;
					for (let i = 0; i < sum.length; i++) sum[i] += share * gradient[i];
				}
				return sum;
			};
			gradients.set(objectiveId, await this.#kept.get(key, make, (gradient) => gradient.byteLength));
		}
		return gradients;
	}

	/** The boxes' part of a move: all that a change of step, weights or constraints leaves as it is. */
	prepared(parent: LoadedShape, recipe: Recipe, checkpoint?: Checkpoint): Promise<PreparedMove> {
		const boxes = recipe.boxes.map(designBox);
		const { mode, smoothing, symmetry, locks } = recipe;
		const key = `move ${parent.id} ${JSON.stringify([mode, smoothing, symmetry, boxes, locks])}`;
		const make = () =>
			prepareMove(parent.surface, boxes, {
				mode,
				smoothing,
				symmetry: symmetry ?? undefined,
				weights: weightsOf(locks, parent.mesh.patches, parent.surface),
				checkpoint
			});
		const bytesOf = ({ moved, unknowns }: PreparedMove) =>
			mode === 'surface' ? 300 * moved.length : 200 * moved.length + 8 * unknowns * unknowns;
		return this.#kept.get(key, make, bytesOf);
	}
}

export function designBox(box: Recipe['boxes'][number]): DesignBox {
	const { id, name, centre, halfSize, rotation, lattice, basis, degree, held, heldPoints, axes, frame } = box;
	return { id, name, centre, halfSize, rotation, lattice, basis, degree, held, heldPoints, axes, frame };
}

/** A stored map as nodal gradient, N x 3 per metre. */
export async function readGradient(map: MapRow, surface: Surface): Promise<Float64Array> {
	const values = new Float64Array((await readWhole(map.valuesId)).buffer);
	return nodalGradient({ kind: map.kind, location: map.location, outward: map.outward, values }, surface);
}
