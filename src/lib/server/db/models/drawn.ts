/** What people draw into a study and edit since: design boxes, keep-outs, locks. Each edit is a new version, and none is ever changed. */
import {
	DataTypes,
	Model,
	type CreationOptional,
	type InferAttributes,
	type InferCreationAttributes,
	type Sequelize
} from 'sequelize';
import { count, createdAt, json, primaryId, reference } from './columns';

class DrawnModel extends Model<InferAttributes<DrawnModel>, InferCreationAttributes<DrawnModel>> {
	declare id: CreationOptional<string>;
	declare studyId: string;
	/** Of keep-outs that were uploaded only. */
	declare positionsId?: CreationOptional<string | null>;
	declare trianglesId?: CreationOptional<string | null>;
	declare originalId?: CreationOptional<string | null>;
	declare archivedAt: CreationOptional<Date | null>;
	declare createdAt: CreationOptional<Date>;
}

class DrawnVersionModel extends Model<InferAttributes<DrawnVersionModel>, InferCreationAttributes<DrawnVersionModel>> {
	declare ownerId: string;
	declare version: number;
	declare definition: object;
	declare createdBy: string | null;
	declare createdAt: CreationOptional<Date>;
}

export class DesignBoxModel extends DrawnModel {}
export class DesignBoxVersionModel extends DrawnVersionModel {}
export class LockModel extends DrawnModel {}
export class LockVersionModel extends DrawnVersionModel {}
export class KeepOutModel extends DrawnModel {}
export class KeepOutVersionModel extends DrawnVersionModel {}

const owner = () => ({ id: primaryId(), studyId: reference(), archivedAt: DataTypes.DATE, createdAt: createdAt() });
const version = () => ({
	ownerId: { ...reference(), primaryKey: true },
	version: { ...count(), primaryKey: true },
	definition: json(),
	createdBy: DataTypes.UUID,
	createdAt: createdAt()
});

export function initDrawn(sequelize: Sequelize) {
	DesignBoxModel.init(owner(), { sequelize, tableName: 'design_boxes' });
	DesignBoxVersionModel.init(version(), { sequelize, tableName: 'design_box_versions' });
	LockModel.init(owner(), { sequelize, tableName: 'locks' });
	LockVersionModel.init(version(), { sequelize, tableName: 'lock_versions' });
	KeepOutModel.init(
		{ ...owner(), positionsId: DataTypes.UUID, trianglesId: DataTypes.UUID, originalId: DataTypes.UUID },
		{ sequelize, tableName: 'keep_outs' }
	);
	KeepOutVersionModel.init(version(), { sequelize, tableName: 'keep_out_versions' });
}
