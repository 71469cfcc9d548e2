import {
	DataTypes,
	Model,
	type CreationOptional,
	type InferAttributes,
	type InferCreationAttributes,
	type Sequelize
} from 'sequelize';
import { primaryId, reference, text } from './columns';

/**
 * What Auth.js keeps beside a person: accounts at an identity provider, database sessions, one-time tokens. Field names are
 * those of its adapters (snake case where OAuth says so), so that a provider can be added without a migration.
 */
export class AccountModel extends Model<InferAttributes<AccountModel>, InferCreationAttributes<AccountModel>> {
	declare id: CreationOptional<string>;
	declare userId: string;
	declare type: string;
	declare provider: string;
	declare providerAccountId: string;
	declare refresh_token: CreationOptional<string | null>;
	declare access_token: CreationOptional<string | null>;
	/** Seconds since 1970. */
	declare expires_at: CreationOptional<number | null>;
	declare token_type: CreationOptional<string | null>;
	declare scope: CreationOptional<string | null>;
	declare id_token: CreationOptional<string | null>;
	declare session_state: CreationOptional<string | null>;
}

export class SessionModel extends Model<InferAttributes<SessionModel>, InferCreationAttributes<SessionModel>> {
	declare id: CreationOptional<string>;
	declare userId: string;
	declare sessionToken: string;
	declare expires: Date;
}

export class VerificationTokenModel extends Model<
	InferAttributes<VerificationTokenModel>,
	InferCreationAttributes<VerificationTokenModel>
> {
	declare token: string;
	declare identifier: string;
	declare expires: Date;
}

export function initAuth(sequelize: Sequelize) {
	AccountModel.init(
		{
			id: primaryId(),
			userId: reference(),
			type: text(),
			provider: text(),
			providerAccountId: text(),
			refresh_token: DataTypes.TEXT,
			access_token: DataTypes.TEXT,
			expires_at: DataTypes.INTEGER,
			token_type: DataTypes.TEXT,
			scope: DataTypes.TEXT,
			id_token: DataTypes.TEXT,
			session_state: DataTypes.TEXT
		},
		{ sequelize, tableName: 'accounts' }
	);
	SessionModel.init(
		{
			id: primaryId(),
			userId: reference(),
			sessionToken: text(),
			expires: { type: DataTypes.DATE, allowNull: false }
		},
		{ sequelize, tableName: 'sessions' }
	);
	VerificationTokenModel.init(
		{
			token: { ...text(), primaryKey: true },
			identifier: text(),
			expires: { type: DataTypes.DATE, allowNull: false }
		},
		{ sequelize, tableName: 'verification_tokens' }
	);
}
