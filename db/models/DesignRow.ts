import { type CreationOptional, DataTypes, type InferAttributes, type InferCreationAttributes, Model, type Sequelize } from 'sequelize';

import type { RecipeInput } from '#schemas/recipe.ts';
import type { Correlation } from '#schemas/correlation.ts';

/** A design: a recipe on an observation set, changed until it is saved as a version. */
export class DesignRow extends Model<InferAttributes<DesignRow>, InferCreationAttributes<DesignRow>> {
  declare id: CreationOptional<string>;
  declare teamId: string;
  declare studyId: string;
  declare observationSetId: string;
  declare name: string;
  declare recipe: RecipeInput;
  declare correlation: Correlation | null;
  /** Counts up with every change: the optimistic lock. */
  declare revision: CreationOptional<number>;
  declare checkJobId: CreationOptional<string | null>;
  declare checkRevision: CreationOptional<number | null>;
  declare updatedBy: string | null;
  declare createdAt: CreationOptional<Date>;
  declare updatedAt: CreationOptional<Date>;
}

export const initDesignRow = (sequelize: Sequelize): void => {
  DesignRow.init(
    {
      id: { type: DataTypes.UUID, primaryKey: true, defaultValue: DataTypes.UUIDV4 },
      teamId: { type: DataTypes.UUID, allowNull: false },
      studyId: { type: DataTypes.UUID, allowNull: false },
      observationSetId: { type: DataTypes.UUID, allowNull: false },
      name: { type: DataTypes.TEXT, allowNull: false },
      recipe: { type: DataTypes.JSONB, allowNull: false },
      correlation: { type: DataTypes.JSONB },
      revision: { type: DataTypes.INTEGER },
      checkJobId: { type: DataTypes.UUID },
      checkRevision: { type: DataTypes.INTEGER },
      updatedBy: { type: DataTypes.UUID },
      createdAt: { type: DataTypes.DATE },
      updatedAt: { type: DataTypes.DATE },
    },
    { sequelize, tableName: 'designs', modelName: 'DesignRow' },
  );
};
