import type { Transaction } from 'sequelize';

import { ObservationSetRow } from '#db/models/ObservationSetRow.ts';
import { StoredFile } from '#db/models/StoredFile.ts';
import type { Mapping, RejectedRow } from '#schemas/observation-sets.ts';
import { getDatabase, inTransaction } from '#server/database.ts';
import { AppError } from '#server/errors.ts';
import { readStoredFile } from '#server/observations/store-upload.ts';

import type { ReadAnswer } from '../numerics/read-observations.ts';
import type { Task } from '../task.ts';
import { runInThread } from '../threads.ts';

interface Payload {
  studyId: string;
  fileId: string;
  observationSetId: string;
  name: string;
  mapping: Mapping | null;
}

const resultOf = (set: Pick<ObservationSetRow, 'id' | 'rowsRead' | 'accepted' | 'rejectedCount'>): Record<string, unknown> => ({
  observationSetId: set.id,
  rowsRead: set.rowsRead,
  accepted: set.accepted,
  rejectedCount: set.rejectedCount,
});

/** Rejected rows in one statement of four arrays: a row at a time takes ten times as long. */
const writeRejected = async (observationSetId: string, from: number, batch: RejectedRow[], transaction: Transaction): Promise<void> => {
  await getDatabase().query(
    `INSERT INTO rejected_rows (observation_set_id, number, line, field, found, reason)
     SELECT $1::uuid, $2::int + ordinality - 1, line, field, found, reason
     FROM unnest($3::int[], $4::text[], $5::text[], $6::text[]) WITH ORDINALITY AS row (line, field, found, reason, ordinality)`,
    {
      bind: [observationSetId, from, batch.map((row) => row.line), batch.map((row) => row.field), batch.map((row) => row.found), batch.map((row) => row.reason)],
      transaction,
    },
  );
};

/** Reads an uploaded file into an observation set. The set appears whole or not at all; a file that cannot be read goes. */
export const readObservationsTask: Task = async (payload, { teamId, userId, signal, reportProgress }) => {
  const { studyId, fileId, observationSetId, name, mapping } = payload as unknown as Payload;
  const done = await ObservationSetRow.findByPk(observationSetId, { attributes: { exclude: ['columnsBundle'] } });
  if (done) return resultOf(done);
  const file = await StoredFile.findByPk(fileId);
  if (!file) throw new AppError('NOT_FOUND', 'The uploaded file is gone, because its study was deleted. Upload it again.');
  reportProgress(0, 'fetching the file');
  const chunks: Uint8Array[] = [];
  for await (const chunk of readStoredFile(fileId)) {
    chunks.push(chunk);
    signal.throwIfAborted();
  }
  try {
    return await inTransaction(async (transaction) => {
      let written = 0;
      const write = async (batch: RejectedRow[]): Promise<void> => {
        await writeRejected(observationSetId, written, batch, transaction);
        written += batch.length;
      };
      const answer = await runInThread<ReadAnswer>(
        { kind: 'read-observations', chunks, mapping: mapping ?? undefined },
        { signal, onProgress: reportProgress, onBatch: (batch) => write(batch as RejectedRow[]) },
      );
      signal.throwIfAborted();
      reportProgress(0.95, 'writing the observation set');
      const { columnsBundle, ...facts } = answer;
      await ObservationSetRow.create(
        { ...facts, id: observationSetId, teamId, studyId, fileId, name, createdBy: userId, columnsBundle: Buffer.from(columnsBundle.buffer, columnsBundle.byteOffset, columnsBundle.byteLength) },
        { transaction },
      );
      return resultOf({ id: observationSetId, ...facts });
    });
  } catch (error) {
    // a worker that stops gives the job back: then the file is still needed
    if (!(error instanceof Error && error.name === 'JobHandedBack')) await StoredFile.destroy({ where: { id: fileId } });
    throw error;
  }
};
