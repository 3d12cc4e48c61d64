import { type CreationOptional, DataTypes, type InferAttributes, type InferCreationAttributes, Model, type Sequelize } from 'sequelize';

import type { ExportFormat } from '#schemas/versions.ts';

/** An export as it was first made: a version always gives the same bytes. */
export class ExportFile extends Model<InferAttributes<ExportFile>, InferCreationAttributes<ExportFile>> {
  declare versionId: string;
  declare format: ExportFormat;
  declare teamId: string;
  declare fileName: string;
  declare mediaType: string;
  declare sha256: string;
  declare bytes: Buffer;
  declare createdAt: CreationOptional<Date>;
}

export const initExportFile = (sequelize: Sequelize): void => {
  ExportFile.init(
    {
      versionId: { type: DataTypes.UUID, primaryKey: true },
      format: { type: DataTypes.TEXT, primaryKey: true },
      teamId: { type: DataTypes.UUID, allowNull: false },
      fileName: { type: DataTypes.TEXT, allowNull: false },
      mediaType: { type: DataTypes.TEXT, allowNull: false },
      sha256: { type: DataTypes.TEXT, allowNull: false },
      bytes: { type: DataTypes.BLOB, allowNull: false },
      createdAt: { type: DataTypes.DATE },
    },
    { sequelize, tableName: 'export_files', modelName: 'ExportFile', updatedAt: false },
  );
};
