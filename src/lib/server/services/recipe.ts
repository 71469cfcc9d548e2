/** Completes what a caller asks for to a recipe: everything that the move depends on, as it is at this moment. */
import type { LengthUnit } from '$lib/api/schemas/common';
import type { Box, KeepOut, Lock } from '$lib/api/schemas/drawn';
import type { ConstraintRequest, Recipe, RecipeRequest } from '$lib/api/schemas/moves';
import { AppError } from '../errors';
import { boxes as boxRows, keepOuts as keepOutRows, locks as lockRows } from '../repositories/drawn';
import { findLatestMaps, findLatestResults, type MapRow, type ShapeRow } from '../repositories/shapes';
import { findStudyRow, listObjectives, listOperatingPoints } from '../repositories/studies';
import { boxAnswer } from './boxes';
import { keepOutAnswer } from './keep-outs';
import { lockAnswer } from './locks';

/** Raised whenever the same recipe would give other bits. */
export const ENGINE_VERSION = '2';

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
	const [objectives, points, boxes, maps, study, locks, keepOuts] = await Promise.all([
		listObjectives(studyId),
		listOperatingPoints(studyId),
		chooseBoxes(studyId, request.boxIds),
		findLatestMaps([shape.id]),
		findStudyRow(studyId),
		chooseLocks(shape, request.lockIds),
		chooseKeepOuts(studyId, request.constraints)
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
	checkPlaces(shape, request.constraints, boxes);
	const hand = checkHand(request, boxes);
	if (maps.length === 0 && request.handMode !== 'replace') {
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
		parentValues: await parentValues(shape, request.constraints, used, mapWeights),
		symmetry: symmetryOf(request, study?.symmetry ?? null),
		locks,
		keepOuts,
		hand,
		handMode: request.handMode
	};
	requireParentValues(recipe, shape, objectives);
	return { recipe, objectives: objectives.map(({ id, name, unit }) => ({ id, name, unit })) };
}

/** In the order asked for. */
async function chooseBoxes(studyId: string, ids: string[]): Promise<Box[]> {
	const found = new Map((await boxRows.list(studyId)).map((box) => [box.id, boxAnswer(box)]));
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

/** All of the study's unless named. One that is painted on another mesh or on patches that the shape has not is refused. */
async function chooseLocks(shape: ShapeRow, ids: string[] | undefined): Promise<Lock[]> {
	const all = (await lockRows.list(shape.studyId)).map(lockAnswer);
	const chosen = ids ? ids.map((id) => all.find((lock) => lock.id === id)) : all;
	return chosen.map((lock, i) => {
		const pointer = ids ? `/lockIds/${i}` : '/lockIds';
		if (!lock) {
			throw invalid(pointer, 'The study has no such lock, or it was put away.', 'Name locks of this study.');
		}
		const missing = missingPatch(shape, lock.patches);
		if (missing !== undefined) {
			const detail = `The lock “${lock.name}” names the patch “${missing}”, which shape ${shape.number} has not.`;
			throw invalid(pointer, detail, 'Change the lock, or name the locks that this move keeps in lockIds.');
		}
		if (lock.painted && lock.painted.topologyId !== shape.topologyId) {
			const detail = `The lock “${lock.name}” was painted on another mesh than that of shape ${shape.number}.`;
			throw invalid(pointer, detail, 'Paint it on this mesh, or name the locks that this move keeps in lockIds.');
		}
		return lock;
	});
}

const missingPatch = (shape: ShapeRow, patches: string[] | undefined): string | undefined =>
	patches?.find((name) => !shape.topology!.patches.some((patch) => patch.name === name));

/** Those that constraints name, each once. */
async function chooseKeepOuts(studyId: string, constraints: ConstraintRequest[]): Promise<KeepOut[]> {
	const ids = constraints.map((c) => (c.kind === 'keepOut' ? c.keepOutId : null));
	if (ids.every((id) => id === null)) return [];
	const all = (await keepOutRows.list(studyId)).map(keepOutAnswer);
	ids.forEach((id, i) => {
		if (id === null || all.some((keepOut) => keepOut.id === id)) return;
		throw invalid(
			`/constraints/${i}/keepOutId`,
			'The study has no such keep-out, or it was put away.',
			'Name keep-outs of this study.'
		);
	});
	return all.filter((keepOut) => ids.includes(keepOut.id));
}

/** Boxes and patches that a constraint is bound to must be there. */
function checkPlaces(shape: ShapeRow, constraints: ConstraintRequest[], boxes: Box[]): void {
	constraints.forEach((constraint, i) => {
		const missing = 'patches' in constraint ? missingPatch(shape, constraint.patches) : undefined;
		if (missing !== undefined) {
			const detail = `Shape ${shape.number} has no patch “${missing}”.`;
			throw invalid(`/constraints/${i}/patches`, detail, 'Name patches that GET /api/shapes/{id} lists.');
		}
		if (constraint.kind !== 'displacement' || constraint.boxId === undefined) return;
		if (boxes.some((box) => box.id === constraint.boxId)) return;
		throw invalid(`/constraints/${i}/boxId`, 'The move has no such design box.', 'Name one of its boxIds.');
	});
}

function checkHand({ hand, handMode, mode, boxIds }: RecipeRequest, boxes: Box[]): Recipe['hand'] {
	if (handMode === 'replace' && (hand.length === 0 || mode === 'surface')) {
		throw invalid(
			'/handMode',
			'A move by hand alone needs control points that were moved.',
			'Give hand, in mode lattice.'
		);
	}
	hand.forEach(({ boxId, displacement }, i) => {
		const box = boxes.find(({ id }) => id === boxId);
		if (!box || hand.findIndex((other) => other.boxId === boxId) !== i) {
			throw invalid(`/hand/${i}/boxId`, 'No box of this move, or named twice.', 'Name boxes of boxIds, each once.');
		}
		const wanted = 3 * box.lattice[0] * box.lattice[1] * box.lattice[2];
		if (displacement.length !== wanted) {
			const detail = `${displacement.length} numbers; the lattice of “${box.name}” takes ${wanted}.`;
			throw invalid(`/hand/${i}/displacement`, detail, 'Give x, y, z of every control point.');
		}
	});
	return boxIds.flatMap((id) => hand.filter(({ boxId }) => boxId === id));
}

function symmetryOf({ symmetry }: RecipeRequest, plane: Recipe['symmetry']): Recipe['symmetry'] {
	if (symmetry === true && !plane) {
		throw invalid('/symmetry', 'The study has no symmetry plane.', 'Set one on the study first.');
	}
	return symmetry === false ? null : plane;
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
