import {
	DataTypes,
	Model,
	type CreationOptional,
	type InferAttributes,
	type InferCreationAttributes,
	type Sequelize
} from 'sequelize';
import { primaryId, reference, createdAt, count } from './columns';

export class BlobModel extends Model<InferAttributes<BlobModel>, InferCreationAttributes<BlobModel>> {
	declare sha256: Buffer;
	declare size: number;
	declare bytes: Buffer;
}

export class ContentModel extends Model<InferAttributes<ContentModel>, InferCreationAttributes<ContentModel>> {
	declare id: CreationOptional<string>;
	declare sha256: Buffer;
	/** A BIGINT: pg hands it over as a string. */
	declare size: string | number;
	declare chunkBytes: number;
	declare createdAt: CreationOptional<Date>;
}

export class ContentChunkModel extends Model<
	InferAttributes<ContentChunkModel>,
	InferCreationAttributes<ContentChunkModel>
> {
	declare contentId: string;
	declare ordinal: number;
	declare sha256: Buffer;
}

export function initContent(sequelize: Sequelize) {
	BlobModel.init(
		{
			sha256: { type: DataTypes.BLOB, primaryKey: true },
			size: count(),
			bytes: { type: DataTypes.BLOB, allowNull: false }
		},
		{ sequelize, tableName: 'blobs' }
	);
	ContentModel.init(
		{
			id: primaryId(),
			sha256: { type: DataTypes.BLOB, allowNull: false },
			size: { type: DataTypes.BIGINT, allowNull: false },
			chunkBytes: count(),
			createdAt: createdAt()
		},
		{ sequelize, tableName: 'contents' }
	);
	ContentChunkModel.init(
		{
			contentId: { ...reference(), primaryKey: true },
			ordinal: { type: DataTypes.INTEGER, allowNull: false, primaryKey: true },
			sha256: { type: DataTypes.BLOB, allowNull: false }
		},
		{ sequelize, tableName: 'content_chunks' }
	);
}
