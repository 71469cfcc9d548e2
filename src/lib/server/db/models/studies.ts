import {
	DataTypes,
	Model,
	type CreationOptional,
	type InferAttributes,
	type InferCreationAttributes,
	type Sequelize
} from 'sequelize';
import type { LengthUnit, Plane, Role } from '$lib/api/schemas/common';
import type { Rehearsal, Sense } from '$lib/api/schemas/studies';
import { primaryId, reference, createdAt, text, number, count, flag, withTimes } from './columns';
import { UserModel } from './people';

export class StudyModel extends Model<InferAttributes<StudyModel>, InferCreationAttributes<StudyModel>> {
	declare id: CreationOptional<string>;
	declare name: string;
	declare note: CreationOptional<string>;
	declare lengthUnit: LengthUnit;
	declare referenceArea: CreationOptional<number | null>;
	declare density: CreationOptional<number | null>;
	declare speed: CreationOptional<number | null>;
	declare symmetry: CreationOptional<Plane | null>;
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
	declare rehearsal: CreationOptional<Rehearsal | null>;
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
			symmetry: DataTypes.JSONB,
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
			rehearsal: DataTypes.JSONB,
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
	StudyMemberModel.belongsTo(UserModel, { as: 'user', foreignKey: 'userId' });
	StudyMemberModel.belongsTo(StudyModel, { as: 'study', foreignKey: 'studyId' });
}
