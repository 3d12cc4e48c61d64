import { type CreationOptional, DataTypes, type InferAttributes, type InferCreationAttributes, Model, type Sequelize } from 'sequelize';

import type { RecipeInput } from '#schemas/recipe.ts';
import type { Correlation } from '#schemas/correlation.ts';
import type { CheckFigures, Finding } from '#schemas/findings.ts';

/** A mesh version: written once, guarded in the database. */
export class MeshVersion extends Model<InferAttributes<MeshVersion>, InferCreationAttributes<MeshVersion>> {
  declare id: CreationOptional<string>;
  declare teamId: string;
  declare studyId: string;
  declare designId: string | null;
  declare designName: string;
  declare observationSetId: string;
  declare observationSha256: string;
  declare number: number;
  declare recipe: RecipeInput;
  declare correlation: Correlation;
  declare findings: Finding[];
  declare figures: CheckFigures;
  declare verdict: 'pass' | 'warn' | 'fail';
  declare waiver: string | null;
  declare note: string;
  declare nodes: number;
  declare elements: number;
  declare meshHash: string;
  /** Array bundle of the designed mesh. */
  declare arrays: Buffer;
  declare softwareVersion: string;
  declare jobId: string | null;
  declare savedBy: string | null;
  declare savedByName: string;
  declare savedAt: CreationOptional<Date>;
}

export const initMeshVersion = (sequelize: Sequelize): void => {
  MeshVersion.init(
    {
      id: { type: DataTypes.UUID, primaryKey: true, defaultValue: DataTypes.UUIDV4 },
      teamId: { type: DataTypes.UUID, allowNull: false },
      studyId: { type: DataTypes.UUID, allowNull: false },
      designId: { type: DataTypes.UUID },
      designName: { type: DataTypes.TEXT, allowNull: false },
      observationSetId: { type: DataTypes.UUID, allowNull: false },
      observationSha256: { type: DataTypes.TEXT, allowNull: false },
      number: { type: DataTypes.INTEGER, allowNull: false },
      recipe: { type: DataTypes.JSONB, allowNull: false },
      correlation: { type: DataTypes.JSONB, allowNull: false },
      findings: { type: DataTypes.JSONB, allowNull: false },
      figures: { type: DataTypes.JSONB, allowNull: false },
      verdict: { type: DataTypes.TEXT, allowNull: false },
      waiver: { type: DataTypes.TEXT },
      note: { type: DataTypes.TEXT, allowNull: false },
      nodes: { type: DataTypes.INTEGER, allowNull: false },
      elements: { type: DataTypes.INTEGER, allowNull: false },
      meshHash: { type: DataTypes.TEXT, allowNull: false },
      arrays: { type: DataTypes.BLOB, allowNull: false },
      softwareVersion: { type: DataTypes.TEXT, allowNull: false },
      jobId: { type: DataTypes.UUID },
      savedBy: { type: DataTypes.UUID },
      savedByName: { type: DataTypes.TEXT, allowNull: false },
      savedAt: { type: DataTypes.DATE },
    },
    { sequelize, tableName: 'mesh_versions', modelName: 'MeshVersion', timestamps: false },
  );
};
