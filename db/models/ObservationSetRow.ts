import { type CreationOptional, DataTypes, type InferAttributes, type InferCreationAttributes, Model, type Sequelize } from 'sequelize';

import type { Mapping, ObservationSet } from '#schemas/observation-sets.ts';

/** What is shown of a set without reading its columns. */
export type ObservationFacts = Pick<ObservationSet, 'columns' | 'flags' | 'extent' | 'timeRange' | 'levelRange'>;

/** A parsed observation set; all but its name never changes. */
export class ObservationSetRow extends Model<InferAttributes<ObservationSetRow>, InferCreationAttributes<ObservationSetRow>> {
  declare id: CreationOptional<string>;
  declare teamId: string;
  declare studyId: string;
  declare fileId: string;
  declare name: string;
  declare format: 'csv' | 'geojson';
  declare crs: 'lonlat-deg' | 'plane-km';
  declare mapping: Mapping;
  declare rowsRead: number;
  declare accepted: number;
  declare rejectedCount: number;
  declare facts: ObservationFacts;
  /** `packObservations` of the accepted rows. */
  declare columnsBundle: Buffer;
  declare createdBy: string | null;
  declare createdAt: CreationOptional<Date>;
}

export const initObservationSetRow = (sequelize: Sequelize): void => {
  ObservationSetRow.init(
    {
      id: { type: DataTypes.UUID, primaryKey: true, defaultValue: DataTypes.UUIDV4 },
      teamId: { type: DataTypes.UUID, allowNull: false },
      studyId: { type: DataTypes.UUID, allowNull: false },
      fileId: { type: DataTypes.UUID, allowNull: false },
      name: { type: DataTypes.TEXT, allowNull: false },
      format: { type: DataTypes.TEXT, allowNull: false },
      crs: { type: DataTypes.TEXT, allowNull: false },
      mapping: { type: DataTypes.JSONB, allowNull: false },
      rowsRead: { type: DataTypes.INTEGER, allowNull: false },
      accepted: { type: DataTypes.INTEGER, allowNull: false },
      rejectedCount: { type: DataTypes.INTEGER, allowNull: false },
      facts: { type: DataTypes.JSONB, allowNull: false },
      columnsBundle: { type: DataTypes.BLOB, allowNull: false },
      createdBy: { type: DataTypes.UUID },
      createdAt: { type: DataTypes.DATE },
    },
    { sequelize, tableName: 'observation_sets', modelName: 'ObservationSetRow', updatedAt: false },
  );
};
