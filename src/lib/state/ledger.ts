/** The study's history for one objective at one operating point: what was predicted, what was found, and what it means. */
import type { ShapeSummary } from '$lib/api/schemas/shapes';
import type { Objective, OperatingPoint } from '$lib/api/schemas/studies';
import { fixed } from '$lib/format/numbers';
import { length, objectiveChange } from '$lib/format/units';
import { shapeNumber } from '$lib/format/words';

export interface LedgerRow {
	shape: ShapeSummary;
	parent: ShapeSummary | null;
	/** As the solver found it, with the half width of its noise. */
	value: number | null;
	uncertainty: number | null;
	/** First order, from the parent. */
	predicted: number | null;
	/** Change from the parent, found; its band combines both runs as independent: the root of the sum of squares. */
	found: number | null;
	foundBand: number | null;
	/** found / predicted; null when either is missing or the prediction is zero. */
	ratio: number | null;
	/** The value that the prediction led to expect: the parent's value (found or itself expected) plus the change. */
	expected: number | null;
}

/**
 * Rows in order of number. Without `pointId` a value is the mean over the operating points by their weights, which is what
 * a prediction is of; it needs a result at each point that counts. At one of several points there is no prediction to show.
 */
export function ledgerRows(
	shapes: readonly ShapeSummary[],
	objectiveId: string,
	pointId: string | null,
	points: readonly OperatingPoint[] = []
): LedgerRow[] {
	const counted = points.filter((point) => point.weight > 0);
	const alone = pointId !== null && counted.some((point) => point.id !== pointId);
	const byId = new Map(shapes.map((shape) => [shape.id, shape]));
	const rows = new Map<string, LedgerRow>();
	for (const shape of [...shapes].sort((a, b) => a.number - b.number)) {
		const result =
			pointId === null && counted.length > 1
				? meanOf(shape, objectiveId, counted)
				: resultOf(shape, objectiveId, pointId);
		const parent = shape.parentId ? (byId.get(shape.parentId) ?? null) : null;
		const before = parent ? rows.get(parent.id) : undefined;
		const value = result?.value ?? null;
		const uncertainty = result?.uncertainty ?? null;
		const predicted = alone ? null : (shape.predicted.find((p) => p.objectiveId === objectiveId)?.change ?? null);
		const found = value !== null && before?.value != null ? value - before.value : null;
		const foundBand =
			found !== null && (uncertainty !== null || before?.uncertainty != null)
				? Math.hypot(uncertainty ?? 0, before?.uncertainty ?? 0)
				: null;
		const base = before?.value ?? before?.expected ?? null;
		rows.set(shape.id, {
			shape,
			parent,
			value,
			uncertainty,
			predicted,
			found,
			foundBand,
			ratio: found !== null && predicted ? found / predicted : null,
			expected: base !== null && predicted !== null ? base + predicted : null
		});
	}
	return [...rows.values()];
}

function resultOf(shape: ShapeSummary, objectiveId: string, pointId: string | null) {
	return shape.results.find(
		(r) => r.objectiveId === objectiveId && (pointId === null || r.operatingPointId === pointId)
	);
}

/** The mean by weight; its band takes the points' runs as independent. Undefined while a point has no result. */
function meanOf(shape: ShapeSummary, objectiveId: string, points: readonly OperatingPoint[]) {
	const total = points.reduce((sum, point) => sum + point.weight, 0);
	let value = 0;
	let square = 0;
	let banded = false;
	for (const point of points) {
		const result = resultOf(shape, objectiveId, point.id);
		if (!result) return undefined;
		value += (point.weight / total) * result.value;
		square += ((point.weight / total) * (result.uncertainty ?? 0)) ** 2;
		banded ||= result.uncertainty !== null;
	}
	return { value, uncertainty: banded ? Math.sqrt(square) : null };
}

/** The row that serves the objective best so far; for `hold`, the one nearest to the baseline's value; null before results. */
export function bestRow(rows: readonly LedgerRow[], sense: Objective['sense']): LedgerRow | null {
	const judged = rows.filter((row) => row.value !== null);
	const base = judged[0]?.value ?? 0;
	const cost = (row: LedgerRow) => {
		const value = row.value ?? 0;
		return sense === 'minimise' ? value : sense === 'maximise' ? -value : Math.abs(value - base);
	};
	// Of equals the newest: it is the one that goes on.
	return judged.reduce<LedgerRow | null>((best, row) => (!best || cost(row) <= cost(best) ? row : best), null);
}

/** Ids of the shape and all its ancestors. */
export function lineage(rows: readonly LedgerRow[], shapeId: string | null): Set<string> {
	const byId = new Map(rows.map((row) => [row.shape.id, row]));
	const line = new Set<string>();
	for (let at = shapeId; at !== null && !line.has(at); at = byId.get(at)?.shape.parentId ?? null) line.add(at);
	return line;
}

export interface Reading {
	/** What the last results say, and in strong words what follows. */
	says: string;
	next: string;
	/** The shape to go on from. */
	from: ShapeSummary;
}

/**
 * What the newest judged shape says about the step. The bands are those of a trust region: below 1/4 of the prediction the
 * step was too long, from 3/4 it may grow (Nocedal and Wright, Numerical Optimization, 2nd ed., Algorithm 4.1). A change
 * within the solver's noise says nothing about the step.
 */
export function readLast(rows: readonly LedgerRow[], objective: Objective): Reading | null {
	const last = [...rows].reverse().find((row) => row.found !== null && row.predicted !== null);
	if (!last || last.found === null || last.predicted === null || !last.parent) return null;
	const { found, predicted, foundBand, ratio, parent } = last;
	const name = capital(shapeNumber(last.shape.number));
	const before = shapeNumber(parent.number);
	const change = (x: number) => objectiveChange(x, objective.unit);
	const facts = `predicted ${change(predicted)}, found ${objectiveChange(found, objective.unit, foundBand)}`;
	const step = last.shape.step;
	const half = step === null ? 'half the step' : `half the step, ${length(step / 2)}`;
	const same = step === null ? 'the same step' : `the same step, ${length(step)}`;

	if (foundBand !== null && Math.abs(found) <= foundBand) {
		return objective.sense === 'hold'
			? {
					says: `${name} held ${objective.name} within the solver’s noise: ${facts}.`,
					next: 'Go on from it.',
					from: last.shape
				}
			: {
					says: `${name}: ${facts}. The change is within the solver’s noise, so it says nothing about the step.`,
					next: 'Run it quieter, or take a longer step.',
					from: last.shape
				};
	}
	if (ratio === null || objective.sense === 'hold') {
		return {
			says: `${name} let ${objective.name} drift: ${facts}.`,
			next: `Compare with ${before} before going on.`,
			from: last.shape
		};
	}
	if (ratio < 0) {
		const worse = predicted < 0 === (objective.sense === 'minimise');
		return {
			says: `${name} ${worse ? 'overshot' : 'went the other way'}: ${facts}.`,
			next: `Go back to ${before} and take ${half} or less.`,
			from: worse ? parent : last.shape
		};
	}
	const share = `${name} found ${fixed(ratio, 2)} of what was predicted`;
	const noise = foundBand === null ? '' : ', beyond the noise';
	if (ratio < 0.25) {
		return {
			says: `${share}${noise}: the step left the range where first order holds.`,
			next: `Take ${half} or less.`,
			from: last.shape
		};
	}
	if (ratio < 0.75) {
		return {
			says: `${share}${noise}: the step is about as long as the map can see.`,
			next: `Keep ${same}.`,
			from: last.shape
		};
	}
	if (ratio <= 1.5) {
		return {
			says: `${share}${noise}: first order holds here.`,
			next: `Keep ${same}, or go up to twice that.`,
			from: last.shape
		};
	}
	return {
		says: `${share}${noise}, more than first order explains.`,
		next: `Keep ${same} and check the map’s sign, unit and scale.`,
		from: last.shape
	};
}

function capital(text: string): string {
	return text.charAt(0).toUpperCase() + text.slice(1);
}
