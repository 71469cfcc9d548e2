import {
	DataTypes,
	Model,
	type CreationOptional,
	type InferAttributes,
	type InferCreationAttributes,
	type Sequelize
} from 'sequelize';
import type { z } from 'zod';
import type { SensitivityMap } from '$lib/api/schemas/maps';
import type { MoveAnswer, Recipe } from '$lib/api/schemas/moves';
import type { Shape } from '$lib/api/schemas/shapes';
import type { Problem } from '$lib/api/schemas/common';
import type { jobKind, jobState } from '$lib/api/schemas/jobs';
import type { mapReport } from '$lib/api/schemas/maps';
import type { patch } from '$lib/api/schemas/shapes';
import { primaryId, reference, createdAt, text, number, count, json, flag } from './columns';
import { UserModel } from './people';

export class TopologyModel extends Model<InferAttributes<TopologyModel>, InferCreationAttributes<TopologyModel>> {
	declare id: CreationOptional<string>;
	declare studyId: string;
	declare vertexCount: number;
	declare triangleCount: number;
	declare trianglesId: string;
	declare attributesId: string | null;
	declare patches: z.infer<typeof patch>[];
	declare encoding: 'binary' | 'ascii';
	declare health: Shape['health'];
	declare createdAt: CreationOptional<Date>;
}

/** Lengths in metres. */
export type Measures = Pick<Shape, 'volume' | 'area' | 'closed' | 'bounds'>;

export class ShapeModel extends Model<InferAttributes<ShapeModel>, InferCreationAttributes<ShapeModel>> {
	declare id: CreationOptional<string>;
	declare studyId: string;
	declare number: number;
	declare parentId: string | null;
	declare name: string;
	declare note: CreationOptional<string>;
	declare topologyId: string;
	declare positionsId: string;
	declare originalId: string | null;
	declare filename: string | null;
	declare measures: Measures;
	declare createdBy: string | null;
	declare createdAt: CreationOptional<Date>;
	declare topology?: TopologyModel;
	declare creator?: UserModel | null;
	declare move?: MoveModel | null;
	declare results?: ResultModel[];
	declare maps?: MapModel[];
}

export class MapModel extends Model<InferAttributes<MapModel>, InferCreationAttributes<MapModel>> {
	declare id: CreationOptional<string>;
	declare shapeId: string;
	declare objectiveId: string;
	declare operatingPointId: string;
	declare filename: string;
	declare kind: SensitivityMap['kind'];
	declare location: SensitivityMap['location'];
	declare outward: SensitivityMap['outward'];
	declare originalId: string | null;
	declare rehearsal: CreationOptional<boolean>;
	declare valuesId: string;
	declare report: z.infer<typeof mapReport>;
	declare createdBy: string | null;
	declare createdAt: CreationOptional<Date>;
	declare shape?: ShapeModel;
	declare creator?: UserModel | null;
}

export class MoveModel extends Model<InferAttributes<MoveModel>, InferCreationAttributes<MoveModel>> {
	declare id: CreationOptional<string>;
	declare studyId: string;
	declare parentShapeId: string;
	declare shapeId: string;
	declare recipe: Recipe;
	/** What the preview answers, without the lattices, which are a content. */
	declare answer: Omit<MoveAnswer, 'lattices' | 'field'>;
	declare latticesId: string;
	declare createdBy: string | null;
	declare createdAt: CreationOptional<Date>;
}

export class ResultModel extends Model<InferAttributes<ResultModel>, InferCreationAttributes<ResultModel>> {
	declare id: CreationOptional<string>;
	declare shapeId: string;
	declare objectiveId: string;
	declare operatingPointId: string;
	declare value: number;
	declare uncertainty: number | null;
	declare note: CreationOptional<string>;
	declare rehearsal: CreationOptional<boolean>;
	declare createdBy: string | null;
	declare createdAt: CreationOptional<Date>;
	declare creator?: UserModel | null;
}

export class JobModel extends Model<InferAttributes<JobModel>, InferCreationAttributes<JobModel>> {
	declare id: CreationOptional<string>;
	declare kind: z.infer<typeof jobKind>;
	declare studyId: string;
	declare payload: Record<string, unknown>;
	declare state: CreationOptional<z.infer<typeof jobState>>;
	declare progress: CreationOptional<number>;
	declare message: CreationOptional<string>;
	declare result: CreationOptional<Record<string, unknown> | null>;
	declare error: CreationOptional<Problem | null>;
	declare cancelRequested: CreationOptional<boolean>;
	declare attempts: CreationOptional<number>;
	declare worker: CreationOptional<string | null>;
	declare heartbeatAt: CreationOptional<Date | null>;
	declare createdBy: string | null;
	declare createdAt: CreationOptional<Date>;
	declare finishedAt: CreationOptional<Date | null>;
}

export function initShapes(sequelize: Sequelize) {
	TopologyModel.init(
		{
			id: primaryId(),
			studyId: reference(),
			vertexCount: count(),
			triangleCount: count(),
			trianglesId: reference(),
			attributesId: DataTypes.UUID,
			patches: json(),
			encoding: text(),
			health: json(),
			createdAt: createdAt()
		},
		{ sequelize, tableName: 'topologies' }
	);
	ShapeModel.init(
		{
			id: primaryId(),
			studyId: reference(),
			number: count(),
			parentId: DataTypes.UUID,
			name: text(),
			note: { ...text(), defaultValue: '' },
			topologyId: reference(),
			positionsId: reference(),
			originalId: DataTypes.UUID,
			filename: DataTypes.TEXT,
			measures: json(),
			createdBy: DataTypes.UUID,
			createdAt: createdAt()
		},
		{ sequelize, tableName: 'shapes' }
	);
	MapModel.init(
		{
			id: primaryId(),
			shapeId: reference(),
			objectiveId: reference(),
			operatingPointId: reference(),
			filename: text(),
			kind: text(),
			location: text(),
			outward: text(),
			originalId: DataTypes.UUID,
			rehearsal: { type: DataTypes.BOOLEAN, allowNull: false, defaultValue: false },
			valuesId: reference(),
			report: json(),
			createdBy: DataTypes.UUID,
			createdAt: createdAt()
		},
		{ sequelize, tableName: 'maps' }
	);
	MoveModel.init(
		{
			id: primaryId(),
			studyId: reference(),
			parentShapeId: reference(),
			shapeId: reference(),
			recipe: json(),
			answer: json(),
			latticesId: reference(),
			createdBy: DataTypes.UUID,
			createdAt: createdAt()
		},
		{ sequelize, tableName: 'moves' }
	);
	ResultModel.init(
		{
			id: primaryId(),
			shapeId: reference(),
			objectiveId: reference(),
			operatingPointId: reference(),
			value: number(),
			uncertainty: DataTypes.DOUBLE,
			note: { ...text(), defaultValue: '' },
			rehearsal: { type: DataTypes.BOOLEAN, allowNull: false, defaultValue: false },
			createdBy: DataTypes.UUID,
			createdAt: createdAt()
		},
		{ sequelize, tableName: 'results' }
	);
	JobModel.init(
		{
			id: primaryId(),
			kind: text(),
			studyId: reference(),
			payload: json(),
			state: { ...text(), defaultValue: 'queued' },
			progress: { type: DataTypes.DOUBLE, allowNull: false, defaultValue: 0 },
			message: { ...text(), defaultValue: '' },
			result: DataTypes.JSONB,
			error: DataTypes.JSONB,
			cancelRequested: flag(false),
			attempts: { ...count(), defaultValue: 0 },
			worker: DataTypes.TEXT,
			heartbeatAt: DataTypes.DATE,
			createdBy: DataTypes.UUID,
			createdAt: createdAt(),
			finishedAt: DataTypes.DATE
		},
		{ sequelize, tableName: 'jobs' }
	);
	ShapeModel.belongsTo(TopologyModel, { as: 'topology', foreignKey: 'topologyId' });
	ShapeModel.belongsTo(UserModel, { as: 'creator', foreignKey: 'createdBy' });
	ShapeModel.hasOne(MoveModel, { as: 'move', foreignKey: 'shapeId' });
	ShapeModel.hasMany(ResultModel, { as: 'results', foreignKey: 'shapeId' });
	ShapeModel.hasMany(MapModel, { as: 'maps', foreignKey: 'shapeId' });
	MapModel.belongsTo(ShapeModel, { as: 'shape', foreignKey: 'shapeId' });
	MapModel.belongsTo(UserModel, { as: 'creator', foreignKey: 'createdBy' });
	ResultModel.belongsTo(UserModel, { as: 'creator', foreignKey: 'createdBy' });
}
