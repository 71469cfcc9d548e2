/** From a stored recipe to what the engine is asked: places by vertex, keep-outs prepared, locks as weights. */
import {
	embed,
	prepareKeepOut,
	prepareThickness,
	toMetres,
	type KeepOutGeometry,
	type MoveConstraint,
	type PlaceSource
} from '$lib/morph';
import type { KeepOut } from '$lib/api/schemas/drawn';
import type { ConstraintRequest, Recipe } from '$lib/api/schemas/moves';
import { readWhole } from '../content/store';
import { keepOutContents } from './keep-outs';
import { patchTriangles } from './lock-weights';
import { designBox, type LoadedShape, type MeshCache } from './mesh-cache';

/** A constraint for the engine, and which of the recipe's it is. */
export interface EngineConstraint {
	index: number;
	constraint: MoveConstraint;
}

/** Vertices of some patches, ascending. */
function patchVertices(names: string[], { mesh }: LoadedShape): Uint32Array {
	const mark = new Uint8Array(mesh.positions.length / 3);
	for (const triangle of patchTriangles(names, mesh.patches)) {
		for (let k = 0; k < 3; k++) mark[mesh.triangles[3 * triangle + k]] = 1;
	}
	return marked(mark);
}

function marked(mark: Uint8Array): Uint32Array {
	const out = new Uint32Array(mark.reduce((sum, m) => sum + m, 0));
	let at = 0;
	mark.forEach((m, v) => {
		if (m) out[at++] = v;
	});
	return out;
}

function meant(
	{ boxId, patches }: { boxId?: string; patches?: string[] },
	recipe: Recipe,
	parent: LoadedShape
): Uint32Array | undefined {
	const box = recipe.boxes.find(({ id }) => id === boxId);
	const inBox = box && embed(parent.surface.positions, designBox(box)).inside;
	if (!patches) return inBox;
	const onPatches = patchVertices(patches, parent);
	if (!inBox) return onPatches;
	const wanted = new Set(inBox);
	return onPatches.filter((v) => wanted.has(v));
}

async function geometryOf({ id, geometry }: KeepOut, metresPerUnit: number): Promise<KeepOutGeometry> {
	if (geometry.kind !== 'mesh') return geometry;
	const { positionsId, trianglesId } = await keepOutContents(id);
	const [positions, triangles] = await Promise.all([readWhole(positionsId), readWhole(trianglesId)]);
	return {
		kind: 'mesh',
		positions: toMetres(new Float32Array(positions.buffer), metresPerUnit),
		triangles: new Uint32Array(triangles.buffer)
	};
}

/** The recipe's constraints as the engine takes them; radii are checks, not constraints of the move. */
export async function engineConstraints(
	recipe: Recipe,
	parent: LoadedShape,
	cache: MeshCache
): Promise<EngineConstraint[]> {
	const out: EngineConstraint[] = [];
	for (const [index, request] of recipe.constraints.entries()) {
		const constraint = await engineConstraint(request, recipe, parent, cache);
		if (constraint) out.push({ index, constraint });
	}
	return out;
}

async function engineConstraint(
	request: ConstraintRequest,
	recipe: Recipe,
	parent: LoadedShape,
	cache: MeshCache
): Promise<MoveConstraint | null> {
	switch (request.kind) {
		case 'volume': {
			const { kind, bound, value, patches } = request;
			// The same list again: the engine keeps a part's volume by it.
			const part =
				patches &&
				(await cache.kept(
					`part ${parent.id} ${JSON.stringify(patches)}`,
					() => patchTriangles(patches, parent.mesh.patches),
					parent.mesh.triangles.byteLength
				));
			return { kind, bound, value, part };
		}
		case 'objective': {
			// An absolute bound becomes one on the change.
			const { kind, objectiveId, bound, value } = request;
			const change = value === undefined ? undefined : value - recipe.parentValues[objectiveId];
			return { kind, objectiveId, bound, value: change };
		}
		case 'displacement': {
			const { kind, inward, outward } = request;
			return { kind, inward, outward, vertices: meant(request, recipe, parent) };
		}
		case 'keepOut': {
			const keepOut = recipe.keepOuts.find(({ id }) => id === request.keepOutId)!;
			const limit = request.clearance ?? keepOut.clearance;
			const key = `keep-out ${keepOut.id} ${keepOut.version} ${limit} ${parent.metresPerUnit}`;
			const source = await cache.kept<PlaceSource>(
				key,
				async () => prepareKeepOut(await geometryOf(keepOut, parent.metresPerUnit), keepOut.side, limit),
				keepOut.geometry.kind === 'mesh' ? 200 * keepOut.geometry.triangleCount : 100
			);
			return { kind: 'keepOut', label: keepOut.name, limit, source };
		}
		case 'thickness': {
			const { kind, least } = request;
			const bytes = 16 * parent.mesh.triangles.length;
			const source = await cache.kept(
				`thickness ${parent.id} ${least}`,
				() => prepareThickness(parent.surface, least),
				bytes
			);
			return { kind, label: 'wall thickness', limit: least, source, vertices: meant(request, recipe, parent) };
		}
		case 'radius':
			return null;
	}
}
