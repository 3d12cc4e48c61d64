import { DataTypes, type InferAttributes, type InferCreationAttributes, Model, type Sequelize } from 'sequelize';

/** A row of the file that was not accepted, counted from 0 in the order of the file. */
export class RejectedRowRow extends Model<InferAttributes<RejectedRowRow>, InferCreationAttributes<RejectedRowRow>> {
  declare observationSetId: string;
  declare number: number;
  declare line: number;
  declare field: string;
  declare found: string;
  declare reason: string;
}

export const initRejectedRowRow = (sequelize: Sequelize): void => {
  RejectedRowRow.init(
    {
      observationSetId: { type: DataTypes.UUID, primaryKey: true },
      number: { type: DataTypes.INTEGER, primaryKey: true },
      line: { type: DataTypes.INTEGER, allowNull: false },
      field: { type: DataTypes.TEXT, allowNull: false },
      found: { type: DataTypes.TEXT, allowNull: false },
      reason: { type: DataTypes.TEXT, allowNull: false },
    },
    { sequelize, tableName: 'rejected_rows', modelName: 'RejectedRowRow', timestamps: false },
  );
};
