import { type CreationOptional, DataTypes, type InferAttributes, type InferCreationAttributes, Model, type Sequelize } from 'sequelize';

import type { VERSION_STATES } from '#schemas/versions.ts';

/** Where a version stands; the only part of it that changes. */
export class MeshVersionState extends Model<InferAttributes<MeshVersionState>, InferCreationAttributes<MeshVersionState>> {
  declare versionId: string;
  declare teamId: string;
  declare state: CreationOptional<(typeof VERSION_STATES)[number]>;
  declare updatedAt: CreationOptional<Date>;
}

export const initMeshVersionState = (sequelize: Sequelize): void => {
  MeshVersionState.init(
    {
      versionId: { type: DataTypes.UUID, primaryKey: true },
      teamId: { type: DataTypes.UUID, allowNull: false },
      state: { type: DataTypes.TEXT },
      updatedAt: { type: DataTypes.DATE },
    },
    { sequelize, tableName: 'mesh_version_states', modelName: 'MeshVersionState', createdAt: false },
  );
};
