/** Completes what a caller asks for to a recipe: everything that the move depends on, as it is at this moment. */
import type { Box, ConstraintRequest, LengthUnit, Recipe, RecipeRequest } from '$lib/api/schemas';
import { AppError } from '../errors';
import { findBoxes } from '../repositories/boxes';
import { findLatestMaps, findLatestResults, type MapRow, type ShapeRow } from '../repositories/shapes';
import { listObjectives, listOperatingPoints } from '../repositories/studies';
import { boxAnswer } from './boxes';

/** Raised whenever the same recipe would give other bits. */
export const ENGINE_VERSION = '1';

/** Metres of one unit of the study's files. */
export const METRES: Record<LengthUnit, number> = { m: 1, cm: 0.01, mm: 0.001, in: 0.0254 };

/** What a move is told besides the recipe, to answer in the study's words. */
export interface StudyObjective {
	id: string;
	name: string;
	unit: string;
}

export interface CompleteRecipe {
	recipe: Recipe;
	/** In the study's order. */
	objectives: StudyObjective[];
}

function invalid(pointer: string, detail: string, mend: string): AppError {
	return new AppError('invalid', detail, { errors: [{ pointer, detail }], mend });
}

/**
 * @throws AppError invalid (unknown box or objective), no-map, no-result
 */
export async function completeRecipe(shape: ShapeRow, request: RecipeRequest): Promise<CompleteRecipe> {
	const { studyId } = shape;
	const [objectives, points, boxes, maps] = await Promise.all([
		listObjectives(studyId),
		listOperatingPoints(studyId),
		chooseBoxes(studyId, request.boxIds),
		findLatestMaps([shape.id])
	]);
	const known = new Set(objectives.map((objective) => objective.id));
	for (const objectiveId of Object.keys(request.weights ?? {})) {
		if (known.has(objectiveId)) continue;
		throw invalid(
			`/weights/${objectiveId}`,
			'The study has no such objective.',
			'Weight objectives of this study only.'
		);
	}
	request.constraints.forEach((constraint, i) => {
		if (constraint.kind !== 'objective' || known.has(constraint.objectiveId)) return;
		throw invalid(
			`/constraints/${i}/objectiveId`,
			'The study has no such objective.',
			'Constrain objectives of this study only.'
		);
	});
	if (maps.length === 0) {
		throw new AppError('no-map', `Shape ${shape.number} has no sensitivity map.`, {
			mend: 'Upload a map of at least one objective for this shape.'
		});
	}
	const mapWeights = shareMaps(maps, new Map(points.map((point) => [point.id, point.weight])));
	const used = maps.filter((map) => map.id in mapWeights);
	const recipe: Recipe = {
		engine: ENGINE_VERSION,
		mode: request.mode,
		step: request.step,
		smoothing: request.smoothing,
		weights: Object.fromEntries(objectives.map(({ id, weight }) => [id, request.weights?.[id] ?? weight])),
		senses: Object.fromEntries(objectives.map(({ id, sense }) => [id, sense])),
		constraints: request.constraints,
		boxIds: boxes.map((box) => box.id),
		boxes,
		mapIds: used.map((map) => map.id),
		mapWeights,
		parentValues: await parentValues(shape, request.constraints, used, mapWeights)
	};
	requireParentValues(recipe, shape, objectives);
	return { recipe, objectives: objectives.map(({ id, name, unit }) => ({ id, name, unit })) };
}

/** In the order asked for. */
async function chooseBoxes(studyId: string, ids: string[]): Promise<Box[]> {
	const found = new Map((await findBoxes(studyId, ids)).map((box) => [box.id, boxAnswer(box)]));
	return ids.map((id, i) => {
		const box = found.get(id);
		if (!box || ids.indexOf(id) !== i) {
			throw invalid(
				`/boxIds/${i}`,
				box ? 'The design box is named twice.' : 'The study has no such design box, or it was put away.',
				'Name design boxes of this study, each once.'
			);
		}
		return box;
	});
}

/** The maps of one objective at several operating points count by the points' weights; one at a point of weight 0 is left out. */
function shareMaps(maps: MapRow[], pointWeights: Map<string, number>): Record<string, number> {
	const weightOf = (map: MapRow) => pointWeights.get(map.operatingPointId) ?? 0;
	const sums = new Map<string, number>();
	for (const map of maps) sums.set(map.objectiveId, (sums.get(map.objectiveId) ?? 0) + weightOf(map));
	const shares: Record<string, number> = {};
	for (const map of maps) {
		if (weightOf(map) > 0) shares[map.id] = weightOf(map) / sums.get(map.objectiveId)!;
	}
	return shares;
}

/** The parent's value of each constrained objective over the operating points of its maps, where every one has a result. */
async function parentValues(
	shape: ShapeRow,
	constraints: ConstraintRequest[],
	maps: MapRow[],
	mapWeights: Record<string, number>
): Promise<Record<string, number>> {
	const ids = new Set(constraints.flatMap((c) => (c.kind === 'objective' ? [c.objectiveId] : [])));
	if (ids.size === 0) return {};
	const results = await findLatestResults([shape.id]);
	const values: Record<string, number> = {};
	for (const objectiveId of ids) {
		let value = 0;
		const its = maps.filter((map) => map.objectiveId === objectiveId);
		for (const map of its) {
			const found = results.find(
				(result) => result.objectiveId === objectiveId && result.operatingPointId === map.operatingPointId
			);
			value += found ? mapWeights[map.id] * found.value : NaN;
		}
		if (its.length > 0 && Number.isFinite(value)) values[objectiveId] = value;
	}
	return values;
}

function requireParentValues(recipe: Recipe, shape: ShapeRow, objectives: StudyObjective[]): void {
	recipe.constraints.forEach((constraint, i) => {
		if (constraint.kind !== 'objective' || constraint.value === undefined) return;
		if (constraint.objectiveId in recipe.parentValues) return;
		const name = objectives.find((objective) => objective.id === constraint.objectiveId)?.name;
		const detail = `The bound on ${name} is a value, but shape ${shape.number} has no result of it to start from.`;
		throw new AppError('no-result', detail, {
			errors: [{ pointer: `/constraints/${i}/value`, detail }],
			mend: `Enter the solver’s result of ${name} for shape ${shape.number}, or leave the value out to bound the change.`
		});
	});
}
