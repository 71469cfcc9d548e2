import {
	DataTypes,
	Model,
	type CreationOptional,
	type InferAttributes,
	type InferCreationAttributes,
	type Sequelize
} from 'sequelize';
import type { BoxCreate, LengthUnit, Role, Sense } from '$lib/api/schemas';
import { primaryId, reference, createdAt, text, number, count, json, flag, withTimes } from './columns';
import { UserModel } from './people';

export class StudyModel extends Model<InferAttributes<StudyModel>, InferCreationAttributes<StudyModel>> {
	declare id: CreationOptional<string>;
	declare name: string;
	declare note: CreationOptional<string>;
	declare lengthUnit: LengthUnit;
	declare referenceArea: CreationOptional<number | null>;
	declare density: CreationOptional<number | null>;
	declare speed: CreationOptional<number | null>;
	declare invented: CreationOptional<boolean>;
	declare nextShapeNumber: CreationOptional<number>;
	declare createdBy: string | null;
	declare createdAt: CreationOptional<Date>;
	declare updatedAt: CreationOptional<Date>;
}

export class StudyMemberModel extends Model<
	InferAttributes<StudyMemberModel>,
	InferCreationAttributes<StudyMemberModel>
> {
	declare studyId: string;
	declare userId: string;
	declare role: Role;
	declare createdAt: CreationOptional<Date>;
	declare user?: UserModel;
}

export class ObjectiveModel extends Model<InferAttributes<ObjectiveModel>, InferCreationAttributes<ObjectiveModel>> {
	declare id: CreationOptional<string>;
	declare studyId: string;
	declare position: number;
	declare name: string;
	declare unit: string;
	declare sense: Sense;
	declare weight: number;
	declare createdAt: CreationOptional<Date>;
	declare updatedAt: CreationOptional<Date>;
}

export class OperatingPointModel extends Model<
	InferAttributes<OperatingPointModel>,
	InferCreationAttributes<OperatingPointModel>
> {
	declare id: CreationOptional<string>;
	declare studyId: string;
	declare position: number;
	declare name: string;
	declare speed: CreationOptional<number | null>;
	declare density: CreationOptional<number | null>;
	declare yaw: CreationOptional<number | null>;
	declare weight: number;
	declare createdAt: CreationOptional<Date>;
}

export class DesignBoxModel extends Model<InferAttributes<DesignBoxModel>, InferCreationAttributes<DesignBoxModel>> {
	declare id: CreationOptional<string>;
	declare studyId: string;
	declare archivedAt: CreationOptional<Date | null>;
	declare createdAt: CreationOptional<Date>;
	declare versions?: DesignBoxVersionModel[];
}

export class DesignBoxVersionModel extends Model<
	InferAttributes<DesignBoxVersionModel>,
	InferCreationAttributes<DesignBoxVersionModel>
> {
	declare boxId: string;
	declare version: number;
	declare definition: BoxCreate;
	declare createdBy: string | null;
	declare createdAt: CreationOptional<Date>;
}

export function initStudies(sequelize: Sequelize) {
	StudyModel.init(
		{
			id: primaryId(),
			name: text(),
			note: { ...text(), defaultValue: '' },
			lengthUnit: text(),
			referenceArea: DataTypes.DOUBLE,
			density: DataTypes.DOUBLE,
			speed: DataTypes.DOUBLE,
			invented: flag(false),
			nextShapeNumber: { type: DataTypes.INTEGER, allowNull: false, defaultValue: 0 },
			createdBy: DataTypes.UUID,
			createdAt: DataTypes.DATE,
			updatedAt: DataTypes.DATE
		},
		{ sequelize, tableName: 'studies', ...withTimes }
	);
	StudyMemberModel.init(
		{
			studyId: { ...reference(), primaryKey: true },
			userId: { ...reference(), primaryKey: true },
			role: text(),
			createdAt: createdAt()
		},
		{ sequelize, tableName: 'study_members' }
	);
	ObjectiveModel.init(
		{
			id: primaryId(),
			studyId: reference(),
			position: count(),
			name: text(),
			unit: text(),
			sense: text(),
			weight: number(),
			createdAt: DataTypes.DATE,
			updatedAt: DataTypes.DATE
		},
		{ sequelize, tableName: 'objectives', ...withTimes }
	);
	OperatingPointModel.init(
		{
			id: primaryId(),
			studyId: reference(),
			position: count(),
			name: text(),
			speed: DataTypes.DOUBLE,
			density: DataTypes.DOUBLE,
			yaw: DataTypes.DOUBLE,
			weight: number(),
			createdAt: createdAt()
		},
		{ sequelize, tableName: 'operating_points' }
	);
	DesignBoxModel.init(
		{ id: primaryId(), studyId: reference(), archivedAt: DataTypes.DATE, createdAt: createdAt() },
		{ sequelize, tableName: 'design_boxes' }
	);
	DesignBoxVersionModel.init(
		{
			boxId: { ...reference(), primaryKey: true },
			version: { type: DataTypes.INTEGER, allowNull: false, primaryKey: true },
			definition: json(),
			createdBy: DataTypes.UUID,
			createdAt: createdAt()
		},
		{ sequelize, tableName: 'design_box_versions' }
	);
	StudyMemberModel.belongsTo(UserModel, { as: 'user', foreignKey: 'userId' });
	StudyMemberModel.belongsTo(StudyModel, { as: 'study', foreignKey: 'studyId' });
	DesignBoxModel.hasMany(DesignBoxVersionModel, { as: 'versions', foreignKey: 'boxId' });
}
