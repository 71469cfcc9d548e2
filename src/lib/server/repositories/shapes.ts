/** Queries on shapes, their topologies, maps, moves and results. */
import { literal, Op, QueryTypes, type CreationAttributes, type Includeable, type Model } from 'sequelize';
import { database } from '../db/client';
import { UserModel } from '../db/models/people';
import { MapModel, MoveModel, ResultModel, ShapeModel, TopologyModel } from '../db/models/shapes';
import { StudyModel } from '../db/models/studies';
import type { Tx } from './transaction';

export type { UserModel as UserRow } from '../db/models/people';
export type {
	MapModel as MapRow,
	Measures,
	MoveModel as MoveRow,
	ResultModel as ResultRow,
	ShapeModel as ShapeRow,
	TopologyModel as TopologyRow
} from '../db/models/shapes';

const creator: Includeable = { model: UserModel, as: 'creator', attributes: ['id', 'name'] };

/** Rows written in one millisecond keep their order: the database's clock counts microseconds. */
const writtenNow = () => literal('clock_timestamp()') as unknown as Date;

/** Everything of a study's shapes that a summary shows, by number. */
export async function findShapes(studyId: string): Promise<ShapeModel[]> {
	return ShapeModel.findAll({
		where: { studyId },
		include: [creator, { model: MoveModel, as: 'move' }],
		order: [['number', 'ASC']]
	});
}

/** A shape with its topology, move and maker. */
export async function findShape(id: string, tx?: Tx): Promise<ShapeModel | null> {
	return ShapeModel.findByPk(id, {
		include: [creator, { model: TopologyModel, as: 'topology' }, { model: MoveModel, as: 'move' }],
		transaction: tx
	});
}

export async function findTopology(id: string): Promise<TopologyModel | null> {
	return TopologyModel.findByPk(id);
}

const latestIds = (table: 'results' | 'maps') =>
	`SELECT DISTINCT ON (shape_id, objective_id, operating_point_id) id FROM ${table}
		WHERE shape_id = ANY($1::uuid[])
		ORDER BY shape_id, objective_id, operating_point_id, created_at DESC, id`;

async function latest(table: 'results' | 'maps', shapeIds: string[], tx?: Tx): Promise<string[]> {
	if (shapeIds.length === 0) return [];
	const rows = await database().query<{ id: string }>(latestIds(table), {
		bind: [shapeIds],
		type: QueryTypes.SELECT,
		transaction: tx
	});
	return rows.map((row) => row.id);
}

/** The latest result of each shape for each objective and operating point. */
export async function findLatestResults(shapeIds: string[], tx?: Tx): Promise<ResultModel[]> {
	const id = { [Op.in]: await latest('results', shapeIds, tx) };
	return ResultModel.findAll({ where: { id }, include: [creator], order: [['createdAt', 'ASC']], transaction: tx });
}

/** The latest map of each shape for each objective and operating point. */
export async function findLatestMaps(shapeIds: string[], tx?: Tx): Promise<MapModel[]> {
	const id = { [Op.in]: await latest('maps', shapeIds, tx) };
	return MapModel.findAll({ where: { id }, include: [creator], order: [['createdAt', 'ASC']], transaction: tx });
}

export async function countMaps(studyId: string): Promise<Map<string, number>> {
	const rows = await database().query<{ shape: string; count: string }>(
		`SELECT m.shape_id AS shape, count(DISTINCT (m.objective_id, m.operating_point_id)) AS count
			FROM maps m JOIN shapes s ON s.id = m.shape_id WHERE s.study_id = $1 GROUP BY m.shape_id`,
		{ bind: [studyId], type: QueryTypes.SELECT }
	);
	return new Map(rows.map((row) => [row.shape, Number(row.count)]));
}

export async function findMap(id: string): Promise<MapModel | null> {
	return MapModel.findByPk(id);
}

export async function findMaps(ids: string[]): Promise<MapModel[]> {
	return MapModel.findAll({ where: { id: { [Op.in]: ids } } });
}

/** The file that a shape comes from, through all its parents. */
export async function findRootFilename(shapeId: string): Promise<string | null> {
	const [row] = await database().query<{ filename: string | null }>(
		`WITH RECURSIVE line AS (
			SELECT id, parent_id, filename FROM shapes WHERE id = $1
			UNION ALL SELECT s.id, s.parent_id, s.filename FROM shapes s JOIN line ON s.id = line.parent_id
		) SELECT filename FROM line WHERE parent_id IS NULL`,
		{ bind: [shapeId], type: QueryTypes.SELECT }
	);
	return row?.filename ?? null;
}

/** Takes the next shape number of a study; the study's row stays locked until the transaction ends. */
export async function takeShapeNumber(studyId: string, tx: Tx): Promise<number> {
	const [row] = await database().query<{ number: number }>(
		`UPDATE studies SET next_shape_number = next_shape_number + 1, updated_at = now() WHERE id = $1
			RETURNING next_shape_number - 1 AS number`,
		{ bind: [studyId], type: QueryTypes.SELECT, transaction: tx }
	);
	return row.number;
}

type Fresh<M extends Model> = Omit<CreationAttributes<M>, 'createdAt'>;

export const insertTopology = (row: Fresh<TopologyModel>, tx: Tx) => TopologyModel.create(row, { transaction: tx });
export const insertShape = (row: Fresh<ShapeModel>, tx: Tx) => ShapeModel.create(row, { transaction: tx });
export const insertMove = (row: Fresh<MoveModel>, tx: Tx) => MoveModel.create(row, { transaction: tx });
export const insertMap = (row: Fresh<MapModel>, tx: Tx) =>
	MapModel.create({ ...row, createdAt: writtenNow() }, { transaction: tx });

export async function insertResult(row: Fresh<ResultModel>, tx: Tx): Promise<ResultModel> {
	const { id } = await ResultModel.create({ ...row, createdAt: writtenNow() }, { transaction: tx });
	return (await ResultModel.findByPk(id, { include: [creator], transaction: tx }))!;
}

export async function findStudy(id: string): Promise<StudyModel | null> {
	return StudyModel.findByPk(id);
}

/** Marks a study as changed just now. */
export async function touchStudy(id: string, tx: Tx): Promise<void> {
	await database().query('UPDATE studies SET updated_at = now() WHERE id = $1', { bind: [id], transaction: tx });
}
