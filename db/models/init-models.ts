import type { Sequelize } from 'sequelize';

import { initDesignRow } from './DesignRow.ts';
import { initExportFile } from './ExportFile.ts';
import { initJobRow } from './JobRow.ts';
import { initMembership } from './Membership.ts';
import { initMeshVersion } from './MeshVersion.ts';
import { initMeshVersionState } from './MeshVersionState.ts';
import { initObservationSetRow } from './ObservationSetRow.ts';
import { initRejectedRowRow } from './RejectedRowRow.ts';
import { initSession } from './Session.ts';
import { initStoredFile } from './StoredFile.ts';
import { initStoredFileChunk } from './StoredFileChunk.ts';
import { initStudy } from './Study.ts';
import { initTeam } from './Team.ts';
import { initUser } from './User.ts';

/** Binds every model to a connection. Call once per process, before the first query. */
export const initModels = (sequelize: Sequelize): void => {
  initUser(sequelize);
  initTeam(sequelize);
  initMembership(sequelize);
  initSession(sequelize);
  initStudy(sequelize);
  initStoredFile(sequelize);
  initStoredFileChunk(sequelize);
  initObservationSetRow(sequelize);
  initRejectedRowRow(sequelize);
  initJobRow(sequelize);
  initDesignRow(sequelize);
  initMeshVersion(sequelize);
  initMeshVersionState(sequelize);
  initExportFile(sequelize);
};
