/** The readable page that goes to the solver's people with a shape. */
import type { Check, ConstraintAnswer } from '$lib/api/schemas/moves';
import type { ShapeRow } from '../repositories/shapes';
import type { StudyRow } from '../repositories/studies';
import { CAUTION } from './move-engine';
import type { StudyObjective } from './recipe';

export interface HandoverParts {
	study: Pick<StudyRow, 'name' | 'lengthUnit' | 'invented'>;
	objectives: StudyObjective[];
	/** With its topology, move and creator. */
	shape: ShapeRow;
	parent: ShapeRow | null;
	stl: { name: string; sha256: string; encoding: 'binary' | 'ascii' };
}

/** Enough digits to see that something was held. */
const exact = (value: number) => String(Number(value.toPrecision(10)));
const digits = (value: number) => String(Number(value.toPrecision(6)));
const millimetres = (metres: number) => `${digits(1000 * metres)} mm`;
const signed = (value: number) => (value > 0 ? `+${digits(value)}` : digits(value));
const BOUNDS: Record<ConstraintAnswer['bound'], string> = { hold: 'held', atLeast: 'at least', atMost: 'at most' };

/** README.txt of a handover: study, shape, how it came about, what is predicted, what was kept, what was checked. */
export function handoverText({ study, objectives, shape, parent, stl }: HandoverParts): string {
	const name = (id: string | undefined) => objectives.find((objective) => objective.id === id)?.name ?? 'an objective';
	const lines = [
		`Shape ${shape.number} of the study "${study.name}"`,
		...(study.invented ? ['(an invented demo: geometry, maps and results are made up)'] : []),
		'',
		`Name       ${shape.name}`,
		...(shape.note ? [`Note       ${shape.note}`] : []),
		`Made       ${shape.createdAt.toISOString()}${shape.creator ? ` by ${shape.creator.name}` : ''}`,
		`Parent     ${parent ? `shape ${parent.number}, ${parent.name}` : 'none: it was uploaded'}`,
		'',
		`File       ${stl.name} (${stl.encoding} STL, lengths in ${study.lengthUnit})`,
		`SHA-256    ${stl.sha256}`,
		`Triangles  ${shape.topology!.triangleCount}, in the order of the upload`,
		`Patches    ${shape.topology!.patches.map((patch) => patch.name || '(unnamed)').join(', ')}`,
		`Area       ${digits(shape.measures.area)} m²`,
		`Volume     ${shape.measures.volume === null ? 'the surface is open' : `${digits(shape.measures.volume)} m³`}`,
		''
	];
	if (shape.move) lines.push(...moveLines(shape.move, objectives, name));
	lines.push('Caution', `  ${CAUTION}`, '');
	return lines.join('\n');
}

function moveLines(
	{ recipe, answer }: NonNullable<ShapeRow['move']>,
	objectives: StudyObjective[],
	name: (id: string | undefined) => string
): string[] {
	const changes = new Map(answer.predicted.map(({ objectiveId, change }) => [objectiveId, change]));
	return [
		'The move (complete in recipe.json)',
		`  Design boxes       ${recipe.boxes.map((box) => `${box.name} (version ${box.version})`).join(', ')}`,
		`  Step               ${millimetres(recipe.step)} (the largest displacement asked for)`,
		`  Smoothing length   ${millimetres(recipe.smoothing)}`,
		`  Displacement       largest ${millimetres(answer.maxDisplacement)}, rms in the boxes ${millimetres(answer.rmsDisplacement)}`,
		'  Outside the boxes every vertex is as in the parent, bit for bit.',
		'',
		'Predicted changes (first order)',
		...objectives.map(({ id, unit, name: objective }) => {
			const change = changes.get(id);
			return `  ${objective}: ${change == null ? 'no map on the parent' : `${signed(change)} ${unit}`}`;
		}),
		'',
		'Constraints',
		...(answer.constraints.length === 0 ? ['  none'] : answer.constraints.map((c) => constraintLine(c, name))),
		'',
		'Checks',
		...Object.entries(answer.checks).map(([key, check]) => checkLine(key, check)),
		''
	];
}

function constraintLine(c: ConstraintAnswer, name: (id: string | undefined) => string): string {
	const what = c.kind === 'volume' ? 'Volume' : name(c.objectiveId);
	const values = c.before === null || c.after === null ? '' : `: ${exact(c.before)} -> ${exact(c.after)} ${c.unit}`;
	return `  ${what} ${BOUNDS[c.bound]}${values}${c.active ? ', binds' : ', free'}`;
}

const CHECK_WORDS: Record<string, string> = {
	flipped: 'Flipped triangles',
	minAngle: 'Smallest angle',
	areaRatio: 'Largest change of a triangle’s area',
	selfIntersection: 'New self-intersections',
	thickness: 'Thinnest wall',
	keepOut: 'Nearest keep-out',
	radius: 'Smallest convex radius'
};

function checkLine(key: string, { value, limit, unit, ok }: Check): string {
	return `  ${CHECK_WORDS[key] ?? key}: ${digits(value)} ${unit} (limit ${digits(limit)}) ${ok ? 'kept' : 'BROKEN'}`;
}
