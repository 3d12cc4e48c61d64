import { type CreationOptional, DataTypes, type InferAttributes, type InferCreationAttributes, Model, type Sequelize } from 'sequelize';

import type { Job, JobKind, JobState } from '#schemas/jobs.ts';

/** Long work as people see it; the queue only carries its id. */
export class JobRow extends Model<InferAttributes<JobRow>, InferCreationAttributes<JobRow>> {
  declare id: CreationOptional<string>;
  declare teamId: string;
  declare userId: string | null;
  declare kind: JobKind;
  declare state: CreationOptional<JobState>;
  declare payload: Record<string, unknown>;
  declare fraction: CreationOptional<number>;
  declare phase: CreationOptional<string>;
  declare result: CreationOptional<Record<string, unknown> | null>;
  declare error: CreationOptional<NonNullable<Job['error']> | null>;
  declare cancelRequested: CreationOptional<boolean>;
  declare attempt: CreationOptional<number>;
  declare createdAt: CreationOptional<Date>;
  declare startedAt: CreationOptional<Date | null>;
  declare finishedAt: CreationOptional<Date | null>;
  declare heartbeatAt: CreationOptional<Date | null>;
}

export const initJobRow = (sequelize: Sequelize): void => {
  JobRow.init(
    {
      id: { type: DataTypes.UUID, primaryKey: true, defaultValue: DataTypes.UUIDV4 },
      teamId: { type: DataTypes.UUID, allowNull: false },
      userId: { type: DataTypes.UUID },
      kind: { type: DataTypes.TEXT, allowNull: false },
      state: { type: DataTypes.TEXT },
      payload: { type: DataTypes.JSONB, allowNull: false },
      fraction: { type: DataTypes.DOUBLE },
      phase: { type: DataTypes.TEXT },
      result: { type: DataTypes.JSONB },
      error: { type: DataTypes.JSONB },
      cancelRequested: { type: DataTypes.BOOLEAN },
      attempt: { type: DataTypes.INTEGER },
      createdAt: { type: DataTypes.DATE },
      startedAt: { type: DataTypes.DATE },
      finishedAt: { type: DataTypes.DATE },
      heartbeatAt: { type: DataTypes.DATE },
    },
    { sequelize, tableName: 'jobs', modelName: 'JobRow', updatedAt: false },
  );
};
