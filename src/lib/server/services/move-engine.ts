/** From a recipe and its parent shape to the moved surface and to what is said about it. Previews and commits take this one way. */
import {
	applyDisplacement,
	checkMove,
	storePositions,
	toMetres,
	TriangleTree,
	USUAL_AREA_RATIO,
	type CheckMoveInput,
	type CheckResult,
	type MoveChecks,
	type ConstraintReport,
	type DesignBox,
	type MoveConstraint,
	type MoveObjective,
	type MoveSolution,
	type PlaceSource,
	type PreparedKeepOut,
	type PreparedThickness,
	type StoredPositions
} from '$lib/morph';
import type { Check, ConstraintAnswer, ConstraintRequest, MoveAnswer, Recipe } from '$lib/api/schemas/moves';
import { AppError } from '../errors';
import type { Control } from '../jobs/control';
import { findShape, type ShapeRow } from '../repositories/shapes';
import { engineConstraints } from './engine-input';
import { MeshCache, type LoadedShape } from './mesh-cache';
import { ENGINE_VERSION, type CompleteRecipe } from './recipe';

export const CAUTION =
	'First-order prediction: valid for small steps only, and the solver must confirm it. Where this surface protects or carries ' +
	'people, its strength, safety and certification are checked elsewhere, under the local codes, by those licensed to do so.';

export interface Moved {
	parent: LoadedShape;
	/** By hand alone there is no descent, and so no metric length. */
	solution: Omit<MoveSolution, 'metricLength' | 'stepFactor'>;
	/** Which of the recipe's constraints each of the engine's is. */
	indices: number[];
	/** Given boxes; the engine's further ones are mirror images. */
	boxes: readonly DesignBox[];
	/** As the engine was given them. */
	constraints: MoveConstraint[];
	/** m, where the recipe has one. */
	leastRadius: number | undefined;
	/** m^3 that the stored surface must enclose, where a volume constraint binds. */
	targetVolume: number | undefined;
}

/**
 * @param shape the parent, with its topology
 * @throws AppError unsupported; MorphError
 */
export async function solveMove(
	shape: ShapeRow,
	recipe: Recipe,
	cache: MeshCache,
	control: Pick<Control, 'stage'>
): Promise<Moved> {
	refuseUnsupported(recipe);
	const parent = await cache.shape(shape, recipe.symmetry, control.stage('Reading the surface', 0, 0.2));
	const gradients = await cache.gradients(recipe, parent.surface);
	const prepared = await cache.prepared(parent, recipe, control.stage('Preparing the move', 0.2, 0.5));
	const objectives: MoveObjective[] = [];
	for (const [id, gradient] of gradients) {
		objectives.push({ id, gradient, sense: recipe.senses[id], weight: recipe.weights[id] });
	}
	const constraints = await engineConstraints(recipe, parent, cache);
	const hand = recipe.boxes.map(({ id }) => {
		const made = recipe.hand.find(({ boxId }) => boxId === id);
		return made ? Float64Array.from(made.displacement) : null;
	});
	const asked = constraints.map(({ constraint }) => constraint);
	const solution =
		recipe.handMode === 'replace'
			? prepared.applyByHand(hand, objectives, asked)
			: prepared.solve({
					objectives,
					step: recipe.step,
					constraints: asked,
					hand: hand.some((made) => made) ? hand : undefined,
					checkpoint: control.stage('Solving for the move', 0.5, 0.8)
				});
	const volume = solution.constraints.find(({ index, kind, active }) => {
		const { constraint } = constraints[index];
		return kind === 'volume' && active && !(constraint.kind === 'volume' && constraint.part);
	});
	return {
		parent,
		solution,
		indices: constraints.map(({ index }) => index),
		boxes: prepared.boxes,
		constraints: asked,
		leastRadius: strictestRadius(recipe),
		targetVolume: volume?.limit
	};
}

function strictestRadius({ constraints }: Recipe): number | undefined {
	const radii = constraints.flatMap((constraint) => (constraint.kind === 'radius' ? [constraint.least] : []));
	return radii.length > 0 ? Math.max(...radii) : undefined;
}

/** What the engine does not do, refused before anything is read. */
function refuseUnsupported(recipe: Recipe): void {
	if (recipe.engine !== ENGINE_VERSION) {
		throw new AppError(
			'unsupported',
			`The recipe was made by engine ${recipe.engine}; this is engine ${ENGINE_VERSION}.`,
			{
				mend: 'Reproduce it with the release that made it.'
			}
		);
	}
	const place = recipe.constraints.findIndex(({ kind }) => PLACE_KINDS.includes(kind));
	if (recipe.mode === 'surface' && place >= 0) {
		const detail = 'In surface mode a move keeps volumes and objectives; bounds at places need a lattice.';
		throw new AppError('unsupported', detail, {
			errors: [{ pointer: `/constraints/${place}`, detail }],
			mend: 'Use the mode "lattice", or leave the constraint out.'
		});
	}
}

const PLACE_KINDS: ConstraintRequest['kind'][] = ['displacement', 'keepOut', 'thickness'];

/** Rounds the moved surface to what is stored. */
export function storedPositions({ parent, solution, targetVolume }: Moved): StoredPositions {
	return storePositions(parent.mesh.positions, solution.moved, solution.displacement, {
		metresPerUnit: parent.metresPerUnit,
		triangles: parent.mesh.triangles,
		targetVolume,
		partners: solution.partners,
		origin: parent.surface.origin
	});
}

const isKeepOut = (source: PlaceSource): source is PreparedKeepOut => 'penetration' in source;
const isThickness = (source: PlaceSource): source is PreparedThickness => 'least' in source;

/** Checks on the moved surface: as it will be stored, or (a preview) as computed, which differs by rounding. */
export async function checkMoved(moved: Moved, cache: MeshCache, stored?: Float32Array): Promise<MoveChecks> {
	const { parent, solution, constraints, leastRadius } = moved;
	const { surface } = parent;
	const { triangles } = parent.mesh;
	const after = stored
		? toMetres(stored, parent.metresPerUnit)
		: applyDisplacement(surface.positions, solution.moved, solution.displacement);
	// Most of the search's time is the tree's, which the next preview can use again.
	const make = () => new TriangleTree(surface.positions, triangles);
	const tree = await cache.kept(`tree ${parent.id}`, make, 20 * triangles.length);
	const keepOuts: CheckMoveInput['keepOuts'] = [];
	const thickness: CheckMoveInput['thickness'] = [];
	for (const constraint of constraints) {
		if (constraint.kind !== 'keepOut' && constraint.kind !== 'thickness') continue;
		const { source, label, vertices } = constraint;
		if (isKeepOut(source)) keepOuts.push({ label, prepared: source });
		else if (isThickness(source)) thickness.push({ prepared: source, vertices });
	}
	return checkMove({
		before: surface.positions,
		after,
		triangles,
		moved: solution.moved,
		areaRatio: USUAL_AREA_RATIO,
		selfIntersection: { tree },
		keepOuts,
		thickness,
		radius: leastRadius === undefined ? undefined : { limit: leastRadius }
	});
}

const CHECK_UNITS: Record<keyof MoveChecks, string> = {
	flipped: 'triangles',
	minAngle: '°',
	areaRatio: '×',
	selfIntersection: 'pairs',
	thickness: 'm',
	keepOut: 'm',
	radius: 'm'
};

const checkAnswer = (result: CheckResult, unit: string): Check => ({
	value: result.value,
	limit: result.limit,
	unit,
	ok: result.ok,
	hard: result.hard,
	count: result.count,
	...(result.before !== undefined && { before: result.before }),
	...(result.label !== undefined && { label: result.label }),
	...(result.place && { triangle: result.place.triangle, place: result.place.position })
});

/** What is said about a move, in the study's words and order. */
export function moveAnswer(complete: CompleteRecipe, moved: Moved, checks: MoveChecks): MoveAnswer {
	const { recipe, objectives } = complete;
	const { parent, solution, indices, boxes } = moved;
	const changes = new Map(solution.predicted.map(({ objectiveId, change }) => [objectiveId, change]));
	const closed = parent.surface.watertight;
	return {
		predicted: objectives.map(({ id }) => ({ objectiveId: id, change: changes.get(id) ?? null })),
		weightedChange: solution.predictedWeighted,
		maxDisplacement: solution.maxDisplacement,
		rmsDisplacement: solution.rmsDisplacement,
		insideVertices: solution.moved.length,
		volumeBefore: closed ? solution.volumeBefore : null,
		volumeAfter: closed ? solution.volumeAfter : null,
		constraints: solution.constraints.map((report) => constraintAnswer(report, indices, complete)),
		checks: Object.fromEntries(
			Object.entries(checks).map(([name, result]) => [name, checkAnswer(result, CHECK_UNITS[name as keyof MoveChecks])])
		),
		lattices: solution.lattices.map((lattice, i) => ({
			boxId: boxes[i].id,
			mirrored: i >= recipe.boxes.length,
			displacement: Array.from(lattice)
		})),
		field: recipe.mode === 'surface' || recipe.locks.length > 0 ? fieldAnswer(solution) : null,
		caution: CAUTION
	};
}

function constraintAnswer(
	{ index, kind, objectiveId, bound, limit, before, after, kept, active, places, place, price }: ConstraintReport,
	indices: number[],
	{ recipe, objectives }: CompleteRecipe
): ConstraintAnswer {
	const request = recipe.constraints[indices[index]];
	const common = { kind, index: indices[index], bound, kept, active, price: active ? price : null };
	const patches = 'patches' in request && request.patches ? { patches: request.patches } : {};
	if (kind === 'volume') return { ...common, ...patches, unit: 'm³', limit, before, after };
	if (kind === 'objective') {
		// The engine knows changes; people, values, where the parent has one.
		const unit = objectives.find(({ id }) => id === objectiveId)?.unit ?? '';
		const start = recipe.parentValues[objectiveId!] ?? null;
		const value = (change: number | null) => (start === null || change === null ? null : start + change);
		return { ...common, objectiveId, unit, limit: value(limit), before: start, after: value(after) };
	}
	const keepOut = request.kind === 'keepOut' && recipe.keepOuts.find(({ id }) => id === request.keepOutId);
	const named = keepOut ? { keepOutId: keepOut.id, name: keepOut.name } : {};
	return { ...common, ...patches, ...named, unit: 'm', limit, before, after, places, place };
}

function fieldAnswer({ moved, displacement }: Moved['solution']): MoveAnswer['field'] {
	const base64 = (array: ArrayBufferView) =>
		Buffer.from(array.buffer, array.byteOffset, array.byteLength).toString('base64');
	return { vertices: base64(moved), displacement: base64(Float32Array.from(displacement)) };
}

/**
 * Makes a move again from its stored recipe.
 *
 * @param parentShapeId the shape that the recipe was made on
 * @returns float32 x, y, z in the study's length unit: bit for bit what is stored for the child
 */
export async function recompute(parentShapeId: string, recipe: Recipe): Promise<Float32Array> {
	const shape = await findShape(parentShapeId);
	if (!shape) throw new AppError('not-found', 'There is no such shape.');
	const moved = await solveMove(shape, recipe, new MeshCache(0), { stage: () => () => {} });
	return storedPositions(moved).positions;
}
