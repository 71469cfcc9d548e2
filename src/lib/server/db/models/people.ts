import {
	DataTypes,
	Model,
	type CreationOptional,
	type InferAttributes,
	type InferCreationAttributes,
	type Sequelize
} from 'sequelize';
import { primaryId, reference, createdAt, text, flag, withTimes } from './columns';

export class UserModel extends Model<InferAttributes<UserModel>, InferCreationAttributes<UserModel>> {
	declare id: CreationOptional<string>;
	declare email: string;
	declare name: string;
	declare emailVerified: CreationOptional<Date | null>;
	declare image: CreationOptional<string | null>;
	declare passwordHash: CreationOptional<string | null>;
	declare isAdmin: CreationOptional<boolean>;
	declare active: CreationOptional<boolean>;
	declare sessionEpoch: CreationOptional<number>;
	declare createdAt: CreationOptional<Date>;
	declare updatedAt: CreationOptional<Date>;
}

export class ApiTokenModel extends Model<InferAttributes<ApiTokenModel>, InferCreationAttributes<ApiTokenModel>> {
	declare id: CreationOptional<string>;
	declare userId: string;
	declare studyId: string | null;
	declare name: string;
	declare prefix: string;
	declare hash: Buffer;
	declare createdAt: CreationOptional<Date>;
	declare lastUsedAt: CreationOptional<Date | null>;
	declare revokedAt: CreationOptional<Date | null>;
	declare user?: UserModel;
}

export class AuditEventModel extends Model<InferAttributes<AuditEventModel>, InferCreationAttributes<AuditEventModel>> {
	declare id: CreationOptional<string>;
	declare at: CreationOptional<Date>;
	declare userId: string | null;
	declare tokenId: string | null;
	declare studyId: string | null;
	declare action: string;
	declare subjectId: string | null;
	declare detail: CreationOptional<Record<string, unknown>>;
}

export function initPeople(sequelize: Sequelize) {
	UserModel.init(
		{
			id: primaryId(),
			email: text(),
			name: text(),
			emailVerified: DataTypes.DATE,
			image: DataTypes.TEXT,
			passwordHash: DataTypes.TEXT,
			isAdmin: flag(false),
			active: flag(true),
			sessionEpoch: { type: DataTypes.INTEGER, allowNull: false, defaultValue: 0 },
			createdAt: DataTypes.DATE,
			updatedAt: DataTypes.DATE
		},
		// The name that Auth.js's adapters derive their foreign keys from.
		{ sequelize, tableName: 'users', name: { singular: 'user', plural: 'users' }, ...withTimes }
	);
	ApiTokenModel.init(
		{
			id: primaryId(),
			userId: reference(),
			studyId: DataTypes.UUID,
			name: text(),
			prefix: text(),
			hash: { type: DataTypes.BLOB, allowNull: false },
			createdAt: createdAt(),
			lastUsedAt: DataTypes.DATE,
			revokedAt: DataTypes.DATE
		},
		{ sequelize, tableName: 'api_tokens' }
	);
	AuditEventModel.init(
		{
			id: { type: DataTypes.BIGINT, primaryKey: true, autoIncrement: true, autoIncrementIdentity: true },
			at: createdAt(),
			userId: DataTypes.UUID,
			tokenId: DataTypes.UUID,
			studyId: DataTypes.UUID,
			action: text(),
			subjectId: DataTypes.UUID,
			detail: { type: DataTypes.JSONB, allowNull: false, defaultValue: {} }
		},
		{ sequelize, tableName: 'audit_events' }
	);
	ApiTokenModel.belongsTo(UserModel, { as: 'user', foreignKey: 'userId' });
}
