import { randomUUID } from 'node:crypto';

import { ForeignKeyConstraintError, Op } from 'sequelize';
import type { z } from 'zod/v4';

import { ObservationSetRow } from '#db/models/ObservationSetRow.ts';
import { RejectedRowRow } from '#db/models/RejectedRowRow.ts';
import { StoredFile } from '#db/models/StoredFile.ts';
import { User } from '#db/models/User.ts';
import type { Job } from '#schemas/jobs.ts';
import type { List, ListQuery } from '#schemas/list.ts';
import { mappingSchema, type ObservationSet, type RejectedRow } from '#schemas/observation-sets.ts';

import type { Context } from '../context.ts';
import { getDatabase, inTransaction } from '../database.ts';
import { AppError, notFound } from '../errors.ts';
import { enqueueJob } from '../jobs/jobs.ts';
import { afterCursor, pageOf, requireId } from '../pages-of-lists.ts';
import { type Action, authorize } from '../policies.ts';
import { parseValue } from '../respond.ts';
import { loadStudy } from '../studies/studies.ts';
import { readStoredFile, receiveUpload, storeFile, tidyText } from './store-upload.ts';

const LIST_COLUMNS = { exclude: ['columnsBundle'] };

const present = (row: ObservationSetRow, file: StoredFile | null | undefined, creator: string): ObservationSet => ({
  id: row.id,
  studyId: row.studyId,
  name: row.name,
  fileName: file?.fileName ?? '',
  byteLength: Number(file?.byteLength ?? 0),
  sha256: file?.sha256 ?? '',
  format: row.format,
  crs: row.crs,
  mapping: row.mapping,
  rowsRead: row.rowsRead,
  accepted: row.accepted,
  rejectedCount: row.rejectedCount,
  ...row.facts,
  createdBy: creator,
  createdAt: row.createdAt.toISOString(),
});

const presentAll = async (rows: ObservationSetRow[]): Promise<Map<string, ObservationSet>> => {
  const files = new Map((await StoredFile.findAll({ where: { id: rows.map((row) => row.fileId) } })).map((file) => [file.id, file]));
  const users = new Map((await User.findAll({ where: { id: rows.flatMap((row) => row.createdBy ?? []) } })).map((user) => [user.id, user.name]));
  return new Map(rows.map((row) => [row.id, present(row, files.get(row.fileId), users.get(row.createdBy ?? '') ?? '')]));
};

/** The set's row without its columns, when the person may do `action` on it. @throws AppError NOT_FOUND, FORBIDDEN */
export const loadObservationSet = async (ctx: Context, setId: string | undefined, action: Action, withColumns = false): Promise<ObservationSetRow> => {
  const id = requireId(setId, 'observation set');
  getDatabase();
  const row = await ObservationSetRow.findByPk(id, withColumns ? {} : { attributes: LIST_COLUMNS });
  authorize(ctx, action, row?.teamId ?? '', 'observation set');
  if (!row) throw notFound('observation set');
  return row;
};

/** Observation sets of a study, newest first. */
export const listObservationSets = async (ctx: Context, studyId: string | undefined, query: ListQuery): Promise<List<ObservationSet>> => {
  const study = await loadStudy(ctx, studyId, 'observations.read');
  const rows = await ObservationSetRow.findAll({
    attributes: LIST_COLUMNS,
    where: { studyId: study.id, ...afterCursor(query.cursor, 'createdAt') },
    order: [['createdAt', 'DESC'], ['id', 'ASC']],
    limit: query.limit + 1,
  });
  const shown = await presentAll(rows);
  return pageOf(rows, query.limit, (row) => row.createdAt, (row) => shown.get(row.id)!);
};

/** One observation set. */
export const getObservationSet = async (ctx: Context, setId: string | undefined): Promise<ObservationSet> => {
  const row = await loadObservationSet(ctx, setId, 'observations.read');
  return (await presentAll([row])).get(row.id)!;
};

/**
 * Keeps the uploaded file and queues the job that reads it. The form has the part `file` and, if not to be detected,
 * `mapping` as JSON and `name`. @throws AppError as `receiveUpload`, VALIDATION_FAILED for the mapping
 */
export const createObservationSet = async (ctx: Context, studyId: string | undefined, request: Request): Promise<Job> => {
  const study = await loadStudy(ctx, studyId, 'observations.write');
  const upload = await receiveUpload(request);
  try {
    const mapping = parseMapping(upload.fields.get('mapping'));
    const name = tidyText(upload.fields.get('name') ?? '', 120) || upload.fileName;
    return await inTransaction(async (transaction) => {
      const file = await storeFile(upload, study.teamId, transaction);
      const payload = { studyId: study.id, fileId: file.id, observationSetId: randomUUID(), name, mapping: mapping ?? null };
      return enqueueJob(ctx, { kind: 'read-observations', teamId: study.teamId, payload, transaction });
    });
  } finally {
    await upload.discard();
  }
};

const parseMapping = (text: string | undefined): z.output<typeof mappingSchema> | undefined => {
  if (text === undefined || text === '') return undefined;
  let value: unknown;
  try {
    value = JSON.parse(text);
  } catch (cause) {
    throw new AppError('VALIDATION_FAILED', 'The mapping is not valid JSON. Correct it, or leave it out to have it detected.', { cause, fields: [{ path: 'mapping', message: 'This is not JSON.' }] });
  }
  return parseValue(mappingSchema, value);
};

/** Deletes a set that no design and no version uses, with its file. @throws AppError IN_USE */
export const deleteObservationSet = async (ctx: Context, setId: string | undefined): Promise<void> => {
  const row = await loadObservationSet(ctx, setId, 'observations.write');
  try {
    await inTransaction(async (transaction) => {
      await row.destroy({ transaction });
      await StoredFile.destroy({ where: { id: row.fileId }, transaction });
    });
  } catch (error) {
    if (error instanceof ForeignKeyConstraintError)
      throw new AppError('IN_USE', 'Designs or versions use this observation set, so it cannot be deleted. Delete its designs first; a set behind a version stays.');
    throw error;
  }
};

/** All columns as one array bundle (`core/formats/observation-bundle`). */
export const getColumnsBundle = async (ctx: Context, setId: string | undefined): Promise<Buffer> =>
  (await loadObservationSet(ctx, setId, 'observations.read', true)).columnsBundle;

/** Rejected rows in the order of the file; the cursor is the number of the next one. */
export const listRejected = async (ctx: Context, setId: string | undefined, query: ListQuery): Promise<List<RejectedRow>> => {
  const row = await loadObservationSet(ctx, setId, 'observations.read');
  const offset = query.cursor === undefined ? 0 : Number(query.cursor);
  if (!Number.isInteger(offset) || offset < 0) throw new AppError('CURSOR_INVALID', 'The cursor is not one that this list gave. Start again without it.');
  const items = await rejectedFrom(row.id, offset, query.limit);
  const next = offset + items.length;
  return { items, nextCursor: next < row.rejectedCount ? String(next) : null };
};

const rejectedFrom = async (observationSetId: string, offset: number, limit: number): Promise<RejectedRow[]> => {
  // numbered from 0 without gaps
  const rows = await RejectedRowRow.findAll({ where: { observationSetId, number: { [Op.gte]: offset } }, order: [['number', 'ASC']], limit });
  return rows.map(({ line, field, found, reason }) => ({ line, field, found, reason }));
};

/** A CSV cell: quoted where needed, and never read as a formula by a spreadsheet (OWASP, CSV injection). */
export const csvCell = (value: string | number): string => {
  const text = String(value);
  const safe = typeof value === 'string' && /^[=+\-@\t\r]/.test(text) ? `'${text}` : text;
  return /[",\n\r]/.test(safe) ? `"${safe.replaceAll('"', '""')}"` : safe;
};

/** Every rejected row as CSV, in pieces. */
export const streamRejectedCsv = async (ctx: Context, setId: string | undefined): Promise<{ fileName: string; chunks: AsyncGenerator<Uint8Array> }> => {
  const row = await loadObservationSet(ctx, setId, 'observations.read');
  const encoder = new TextEncoder();
  const chunks = async function* (): AsyncGenerator<Uint8Array> {
    yield encoder.encode('line,field,found,reason\r\n');
    for (let offset = 0; offset < row.rejectedCount; offset += 5000) {
      const rows = await rejectedFrom(row.id, offset, 5000);
      yield encoder.encode(rows.map((r) => [r.line, r.field, r.found, r.reason].map(csvCell).join(',') + '\r\n').join(''));
    }
  };
  return { fileName: `${row.name}-rejected-rows.csv`, chunks: chunks() };
};

/** The file as it was uploaded, byte for byte. */
export const openOriginal = async (
  ctx: Context,
  setId: string | undefined,
): Promise<{ fileName: string; byteLength: number; sha256: string; chunks: AsyncGenerator<Buffer> }> => {
  const row = await loadObservationSet(ctx, setId, 'observations.read');
  const file = await StoredFile.findByPk(row.fileId);
  if (!file) throw notFound('file');
  return { fileName: file.fileName, byteLength: Number(file.byteLength), sha256: file.sha256, chunks: readStoredFile(file.id) };
};
