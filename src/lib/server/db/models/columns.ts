/** Column definitions that many tables share. Functions, since Sequelize writes the column's name into the object it is given. */
import { DataTypes } from 'sequelize';

export const primaryId = () => ({ type: DataTypes.UUID, primaryKey: true, defaultValue: DataTypes.UUIDV4 });
export const reference = () => ({ type: DataTypes.UUID, allowNull: false });
export const createdAt = () => ({ type: DataTypes.DATE, allowNull: false, defaultValue: DataTypes.NOW });
export const text = () => ({ type: DataTypes.TEXT, allowNull: false });
export const number = () => ({ type: DataTypes.DOUBLE, allowNull: false });
export const count = () => ({ type: DataTypes.INTEGER, allowNull: false });
export const json = () => ({ type: DataTypes.JSONB, allowNull: false });
export const flag = (defaultValue: boolean) => ({ type: DataTypes.BOOLEAN, allowNull: false, defaultValue });

/** For tables with both created_at and updated_at kept by Sequelize. */
export const withTimes = { timestamps: true } as const;
