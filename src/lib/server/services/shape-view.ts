/** Shapes, maps and results as they leave: every field is named here. */
import type { Person } from '$lib/api/schemas/common';
import type { Result, SensitivityMap } from '$lib/api/schemas/maps';
import type { Prediction } from '$lib/api/schemas/moves';
import type { Shape, ShapeState, ShapeSummary } from '$lib/api/schemas/shapes';
import type { MapRow, ResultRow, ShapeRow, UserRow } from '../repositories/shapes';

const person = (user: UserRow | null | undefined): Person | null => (user ? { id: user.id, name: user.name } : null);

export function resultView(row: ResultRow): Result {
	return {
		id: row.id,
		shapeId: row.shapeId,
		objectiveId: row.objectiveId,
		operatingPointId: row.operatingPointId,
		value: row.value,
		uncertainty: row.uncertainty,
		note: row.note,
		rehearsal: row.rehearsal,
		createdAt: row.createdAt.toISOString(),
		createdBy: person(row.creator)
	};
}

export function mapView(row: MapRow): SensitivityMap {
	return {
		id: row.id,
		shapeId: row.shapeId,
		objectiveId: row.objectiveId,
		operatingPointId: row.operatingPointId,
		filename: row.filename,
		kind: row.kind,
		location: row.location,
		outward: row.outward,
		report: row.report,
		rehearsal: row.rehearsal,
		createdAt: row.createdAt.toISOString(),
		createdBy: person(row.creator)
	};
}

export interface ShapeParts {
	/** The study's objectives in their order. */
	objectiveIds: string[];
	/** The latest of this shape. */
	results: ResultRow[];
	mapCount: number;
}

function state(row: ShapeRow, results: ResultRow[]): ShapeState {
	if (row.number === 0) return 'baseline';
	return results.length > 0 ? 'judged' : 'open';
}

/** The prediction in the study's order; an objective that came later has none. */
function predicted(row: ShapeRow, objectiveIds: string[]): Prediction[] {
	const changes = new Map(row.move?.answer.predicted.map((p) => [p.objectiveId, p.change]));
	return row.move ? objectiveIds.map((objectiveId) => ({ objectiveId, change: changes.get(objectiveId) ?? null })) : [];
}

export function summaryView(row: ShapeRow, { objectiveIds, results, mapCount }: ShapeParts): ShapeSummary {
	const move = row.move;
	return {
		id: row.id,
		studyId: row.studyId,
		number: row.number,
		parentId: row.parentId,
		name: row.name,
		note: row.note,
		state: state(row, results),
		volume: row.measures.volume,
		area: row.measures.area,
		closed: row.measures.closed,
		step: move?.recipe.step ?? null,
		smoothing: move?.recipe.smoothing ?? null,
		maxDisplacement: move?.answer.maxDisplacement ?? null,
		rmsDisplacement: move?.answer.rmsDisplacement ?? null,
		predicted: predicted(row, objectiveIds),
		results: results.map(resultView),
		mapCount,
		createdAt: row.createdAt.toISOString(),
		createdBy: person(row.creator)
	};
}

/** @param row with its topology */
export function shapeView(row: ShapeRow, parts: Omit<ShapeParts, 'mapCount'> & { maps: MapRow[] }): Shape {
	const topology = row.topology!;
	return {
		...summaryView(row, { ...parts, mapCount: parts.maps.length }),
		topologyId: row.topologyId,
		vertexCount: topology.vertexCount,
		triangleCount: topology.triangleCount,
		bounds: row.measures.bounds,
		patches: topology.patches,
		health: topology.health,
		filename: row.filename,
		...(row.move && { recipe: row.move.recipe }),
		constraints: row.move?.answer.constraints ?? [],
		checks: row.move?.answer.checks ?? {},
		maps: parts.maps.map(mapView)
	};
}
