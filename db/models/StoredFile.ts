import { type CreationOptional, DataTypes, type InferAttributes, type InferCreationAttributes, Model, type Sequelize } from 'sequelize';

/** The bytes of an upload, kept in chunks; never changed. */
export class StoredFile extends Model<InferAttributes<StoredFile>, InferCreationAttributes<StoredFile>> {
  declare id: CreationOptional<string>;
  declare teamId: string;
  declare fileName: string;
  /** BIGINT: read as a string. */
  declare byteLength: string | number;
  declare sha256: string;
  declare createdAt: CreationOptional<Date>;
}

export const initStoredFile = (sequelize: Sequelize): void => {
  StoredFile.init(
    {
      id: { type: DataTypes.UUID, primaryKey: true, defaultValue: DataTypes.UUIDV4 },
      teamId: { type: DataTypes.UUID, allowNull: false },
      fileName: { type: DataTypes.TEXT, allowNull: false },
      byteLength: { type: DataTypes.BIGINT, allowNull: false },
      sha256: { type: DataTypes.TEXT, allowNull: false },
      createdAt: { type: DataTypes.DATE },
    },
    { sequelize, tableName: 'stored_files', modelName: 'StoredFile', updatedAt: false },
  );
};
