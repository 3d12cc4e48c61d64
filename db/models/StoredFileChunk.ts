import { DataTypes, type InferAttributes, type InferCreationAttributes, Model, type Sequelize } from 'sequelize';

/** One piece of a stored file, counted from 0. */
export class StoredFileChunk extends Model<InferAttributes<StoredFileChunk>, InferCreationAttributes<StoredFileChunk>> {
  declare fileId: string;
  declare number: number;
  declare bytes: Buffer;
}

export const initStoredFileChunk = (sequelize: Sequelize): void => {
  StoredFileChunk.init(
    {
      fileId: { type: DataTypes.UUID, primaryKey: true },
      number: { type: DataTypes.INTEGER, primaryKey: true },
      bytes: { type: DataTypes.BLOB, allowNull: false },
    },
    { sequelize, tableName: 'stored_file_chunks', modelName: 'StoredFileChunk', timestamps: false },
  );
};
