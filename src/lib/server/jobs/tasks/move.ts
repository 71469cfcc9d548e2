/** Previews a move, or commits it as a new shape. */
import { randomUUID } from 'node:crypto';
import { surfaceMeasures, toMetres } from '$lib/morph';
import type { MoveCommitted } from '$lib/api/schemas/jobs';
import type { Check, MoveAnswer, Recipe, RecipeRequest } from '$lib/api/schemas/moves';
import { POSITION_CHUNK_BYTES, putContent } from '../../content/store';
import { AppError } from '../../errors';
import { recordEvent } from '../../repositories/audit';
import { findShape, insertMove, insertShape, takeShapeNumber, type ShapeRow } from '../../repositories/shapes';
import { MeshCache } from '../../services/mesh-cache';
import { checkMoved, moveAnswer, solveMove, storedPositions } from '../../services/move-engine';
import { completeRecipe, type CompleteRecipe } from '../../services/recipe';
import type { Control } from '../control';
import { measuresOf } from './import-shape';
import { actorOf, storeAndEnd, type JobTask } from './job-task';

interface Payload extends CompleteRecipe {
	shapeId: string;
	name?: string;
	note?: string;
}

async function requireShape(id: string): Promise<ShapeRow> {
	const shape = await findShape(id);
	if (!shape) throw new AppError('not-found', 'There is no such shape.');
	return shape;
}

/** @throws AppError, MorphError, Stopped */
export async function previewTask(
	shapeId: string,
	request: RecipeRequest,
	cache: MeshCache,
	control: Control
): Promise<MoveAnswer> {
	const shape = await requireShape(shapeId);
	const complete = await completeRecipe(shape, request);
	const moved = await solveMove(shape, complete.recipe, cache, control);
	control.stage('Checking the moved surface', 0.9, 1);
	return moveAnswer(complete, moved, await checkMoved(moved, cache));
}

/** @throws AppError check-failed and others, MorphError, Stopped, NotOurs */
export async function commitTask(task: JobTask): Promise<void> {
	const { job, control } = task;
	const { shapeId: parentId, name, note, recipe, objectives } = job.payload as unknown as Payload;
	const parent = await requireShape(parentId);
	const cache = new MeshCache(0);
	const moved = await solveMove(parent, recipe, cache, control);
	const checkpoint = control.stage('Checking the moved surface', 0.8, 0.9);
	const { positions } = storedPositions(moved);
	const answer = moveAnswer({ recipe, objectives }, moved, await checkMoved(moved, cache, positions));
	refuseBroken(answer.checks);
	const { triangles } = moved.parent.mesh;
	const measures = surfaceMeasures(toMetres(positions, moved.parent.metresPerUnit), triangles, { checkpoint });
	const progress = control.stage('Storing the moved shape', 0.9, 1);
	await storeAndEnd(
		task,
		'The moved shape is stored',
		async (tx) => {
			const stored = await putContent(positions, tx, { chunkBytes: POSITION_CHUNK_BYTES });
			progress(0.8);
			const lattices = await putContent(together(moved.solution.lattices), tx);
			return { positionsId: stored.id, latticesId: lattices.id };
		},
		async (tx, { positionsId, latticesId }): Promise<MoveCommitted> => {
			const shapeId = randomUUID();
			const moveId = randomUUID();
			const number = await takeShapeNumber(job.studyId, tx);
			await insertShape(
				{
					id: shapeId,
					studyId: job.studyId,
					number,
					parentId,
					name: name ?? defaultName(recipe),
					note: note ?? '',
					topologyId: parent.topologyId,
					positionsId,
					originalId: null,
					filename: null,
					measures: measuresOf(measures),
					createdBy: job.createdBy
				},
				tx
			);
			// Large, and made again from the recipe when asked for.
			const { lattices: _lattices, field: _field, ...kept } = answer;
			const row = { id: moveId, studyId: job.studyId, parentShapeId: parentId, shapeId, recipe, answer: kept };
			await insertMove({ ...row, latticesId, createdBy: job.createdBy }, tx);
			await recordEvent(tx, actorOf(job), {
				studyId: job.studyId,
				action: 'move.committed',
				subjectId: shapeId,
				detail: { moveId, parentId, number, step: recipe.step, smoothing: recipe.smoothing }
			});
			return { ...answer, shapeId, moveId };
		}
	);
}

/** All boxes' control point displacements, one after the other. */
function together(lattices: Float64Array[]): Float64Array {
	const whole = new Float64Array(lattices.reduce((sum, lattice) => sum + lattice.length, 0));
	let at = 0;
	for (const lattice of lattices) {
		whole.set(lattice, at);
		at += lattice.length;
	}
	return whole;
}

const BROKEN: Record<string, (check: Check) => string> = {
	flipped: ({ value, triangle }) =>
		`${value} triangle${value === 1 ? '' : 's'} would turn over, the worst of them triangle ${triangle}`,
	minAngle: ({ value, limit, triangle }) =>
		`the smallest angle would be ${value.toFixed(2)}°, below ${limit}°, in triangle ${triangle}`,
	selfIntersection: ({ value, before, triangle }) =>
		`${value} pair${value === 1 ? '' : 's'} of triangles would pass through each other, the first at triangle ${triangle}` +
		(before ? ` (${before} that do so in the parent are not counted)` : ''),
	thickness: ({ value, limit, count, triangle }) =>
		`at ${count} vertices the wall would be thinner than ${millimetres(limit)} and than it is, the worst of them ` +
		`${millimetres(value)} at triangle ${triangle}`,
	keepOut: ({ value, limit, count, label, triangle }) =>
		`the surface would come within ${millimetres(value)} of "${label}" (clearance ${millimetres(limit)}; below 0 is inside), ` +
		`worst at triangle ${triangle}, ${count} place${count === 1 ? '' : 's'} in all`,
	radius: ({ value, limit, count, triangle }) =>
		`at ${count} vertices the surface would be sharper than the radius ${millimetres(limit)} and than it is, the worst of them ` +
		`${millimetres(value)} at triangle ${triangle}`
};

const millimetres = (metres: number) => `${Number((1000 * metres).toPrecision(3))} mm`;

function refuseBroken(checks: MoveAnswer['checks']): void {
	const broken = Object.entries(checks).filter(([, check]) => check.hard && !check.ok);
	if (broken.length === 0) return;
	const words = broken.map(
		([name, check]) => BROKEN[name]?.(check) ?? `${name} is ${check.value} ${check.unit}, limit ${check.limit}`
	);
	throw new AppError(
		'check-failed',
		`The move breaks the check ${broken.map(([name]) => name).join(', ')}: ${words.join('; ')}.`,
		{
			mend: 'Take a shorter step or a longer smoothing length, or fewer control points.'
		}
	);
}

function defaultName({ step, boxes }: Recipe): string {
	const text = `step ${Number((1000 * step).toPrecision(4))} mm in ${boxes.map((box) => box.name).join(', ')}`;
	return text.length > 120 ? `${text.slice(0, 119)}…` : text;
}
