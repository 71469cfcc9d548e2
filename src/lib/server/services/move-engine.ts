/** From a recipe and its parent shape to the moved surface and to what is said about it. Previews and commits take this one way. */
import {
	applyDisplacement,
	checkMove,
	storePositions,
	type CheckResult,
	type MoveChecks,
	type MoveConstraint,
	type MoveObjective,
	type MoveSolution,
	type StoredPositions
} from '$lib/morph';
import type { Check, ConstraintAnswer, ConstraintRequest, MoveAnswer, Recipe } from '$lib/api/schemas';
import { AppError } from '../errors';
import type { Control } from '../jobs/control';
import { findShape, type ShapeRow } from '../repositories/shapes';
import { MeshCache, type LoadedShape } from './mesh-cache';
import { ENGINE_VERSION, type CompleteRecipe } from './recipe';

export const CAUTION =
	'First-order prediction: valid for small steps only, and the solver must confirm it. Where this surface protects or carries ' +
	'people, its strength, safety and certification are checked elsewhere, under the local codes, by those licensed to do so.';

export interface Moved {
	parent: LoadedShape;
	solution: MoveSolution;
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
	const parent = await cache.shape(shape, control.stage('Reading the surface', 0, 0.25));
	const gradients = await cache.gradients(recipe, parent.surface);
	const prepared = await cache.prepared(
		shape.id,
		recipe,
		parent.surface,
		control.stage('Preparing the move', 0.25, 0.6)
	);
	const objectives: MoveObjective[] = [];
	for (const [id, gradient] of gradients) {
		objectives.push({ id, gradient, sense: recipe.senses[id], weight: recipe.weights[id] });
	}
	const solution = prepared.solve({
		objectives,
		step: recipe.step,
		constraints: recipe.constraints.map((constraint) => engineConstraint(constraint, recipe.parentValues)),
		checkpoint: control.stage('Solving for the move', 0.6, 0.8)
	});
	const volume = solution.constraints.find((constraint) => constraint.kind === 'volume' && constraint.active);
	return { parent, solution, targetVolume: volume?.limit };
}

/** What the engine does not do yet, refused before anything is read. */
function refuseUnsupported(recipe: Recipe): void {
	if (recipe.mode !== 'lattice') {
		throw new AppError('unsupported', 'Moves without a lattice (mode "surface") are not available yet.', {
			errors: [{ pointer: '/mode', detail: 'only "lattice" is available' }],
			mend: 'Use the mode "lattice".'
		});
	}
	if (recipe.engine !== ENGINE_VERSION) {
		throw new AppError(
			'unsupported',
			`The recipe was made by engine ${recipe.engine}; this is engine ${ENGINE_VERSION}.`,
			{
				mend: 'Reproduce it with the release that made it.'
			}
		);
	}
}

/** An absolute bound on an objective becomes one on its change. */
function engineConstraint(constraint: ConstraintRequest, parentValues: Record<string, number>): MoveConstraint {
	if (constraint.kind === 'volume' || constraint.value === undefined) return constraint;
	return { ...constraint, value: constraint.value - parentValues[constraint.objectiveId] };
}

/** Rounds the moved surface to what is stored. */
export function storedPositions({ parent, solution, targetVolume }: Moved): StoredPositions {
	return storePositions(parent.mesh.positions, solution.moved, solution.displacement, {
		metresPerUnit: parent.metresPerUnit,
		triangles: parent.mesh.triangles,
		targetVolume
	});
}

/** Checks on the moved surface: as it will be stored, or (a preview) as computed, which differs by rounding. */
export function checkMoved({ parent, solution }: Moved, stored?: Float32Array): MoveChecks {
	const { mesh, surface } = parent;
	if (!stored) {
		const after = applyDisplacement(surface.positions, solution.moved, solution.displacement);
		return checkMove({ before: surface.positions, after, triangles: mesh.triangles, moved: solution.moved });
	}
	const { metresPerUnit } = parent;
	return checkMove({
		before: mesh.positions,
		after: stored,
		triangles: mesh.triangles,
		moved: solution.moved,
		metresPerUnit
	});
}

const CHECK_UNITS: Record<keyof MoveChecks, string> = { flipped: 'triangles', minAngle: '°' };

const checkAnswer = (result: CheckResult, unit: string): Check => ({
	value: result.value,
	limit: result.limit,
	unit,
	ok: result.ok,
	hard: result.hard,
	...(result.place && { triangle: result.place.triangle, place: result.place.position })
});

/** What is said about a move, in the study's words and order. */
export function moveAnswer(
	{ recipe, objectives }: CompleteRecipe,
	{ parent, solution }: Moved,
	checks: MoveChecks
): MoveAnswer {
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
		constraints: solution.constraints.map((report): ConstraintAnswer => {
			const { kind, objectiveId, bound, active } = report;
			if (kind !== 'volume' && kind !== 'objective') throw new Error(`no answer for constraints of kind ${kind}`);
			const price = active ? report.price : null;
			if (kind === 'volume') {
				return { kind, bound, unit: 'm³', before: report.before, after: report.after, active, price };
			}
			const unit = objectives.find(({ id }) => id === objectiveId)?.unit ?? '';
			const before = recipe.parentValues[objectiveId!] ?? null;
			const after = before === null || report.after === null ? null : before + report.after;
			return { kind, objectiveId, bound, unit, before, after, active, price };
		}),
		checks: Object.fromEntries(
			Object.entries(checks).map(([name, result]) => [name, checkAnswer(result, CHECK_UNITS[name as keyof MoveChecks])])
		),
		lattices: recipe.boxes.map((box, i) => ({ boxId: box.id, displacement: Array.from(solution.lattices[i]) })),
		caution: CAUTION
	};
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
