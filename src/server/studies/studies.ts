import { ForeignKeyConstraintError, QueryTypes } from 'sequelize';
import type { z } from 'zod/v4';

import { StoredFile } from '#db/models/StoredFile.ts';
import { Study as StudyRow } from '#db/models/Study.ts';
import type { List, ListQuery } from '#schemas/list.ts';
import type { createStudySchema, Study, updateStudySchema } from '#schemas/studies.ts';

import type { Context } from '../context.ts';
import { getDatabase } from '../database.ts';
import { AppError, notFound } from '../errors.ts';
import { afterCursor, pageOf, requireId } from '../pages-of-lists.ts';
import { type Action, authorize } from '../policies.ts';

interface Counts {
  studyId: string;
  observationSetCount: number;
  designCount: number;
  versionCount: number;
  creator: string | null;
}

const countsOf = async (ids: string[]): Promise<Map<string, Counts>> => {
  if (ids.length === 0) return new Map();
  const rows = await getDatabase().query<Counts>(
    `SELECT s.id AS "studyId",
       (SELECT count(*)::int FROM observation_sets o WHERE o.study_id = s.id) AS "observationSetCount",
       (SELECT count(*)::int FROM designs d WHERE d.study_id = s.id) AS "designCount",
       (SELECT count(*)::int FROM mesh_versions v WHERE v.study_id = s.id) AS "versionCount",
       (SELECT u.name FROM users u WHERE u.id = s.created_by) AS creator
     FROM studies s WHERE s.id IN (:ids)`,
    { replacements: { ids }, type: QueryTypes.SELECT },
  );
  return new Map(rows.map((row) => [row.studyId, row]));
};

const present = (study: StudyRow, counts: Counts | undefined): Study => ({
  id: study.id,
  teamId: study.teamId,
  name: study.name,
  description: study.description,
  correlation: study.correlation,
  createdBy: counts?.creator ?? '',
  createdAt: study.createdAt.toISOString(),
  updatedAt: study.updatedAt.toISOString(),
  observationSetCount: counts?.observationSetCount ?? 0,
  designCount: counts?.designCount ?? 0,
  versionCount: counts?.versionCount ?? 0,
});

/** The study's row, when the person may do `action` on it. @throws AppError NOT_FOUND, FORBIDDEN */
export const loadStudy = async (ctx: Context, studyId: string | undefined, action: Action): Promise<StudyRow> => {
  const id = requireId(studyId, 'study');
  getDatabase();
  const study = await StudyRow.findByPk(id);
  if (!study) {
    authorize(ctx, action, '', 'study');
    throw notFound('study');
  }
  authorize(ctx, action, study.teamId, 'study');
  return study;
};

/** Studies of a team, newest first. */
export const listStudies = async (ctx: Context, teamId: string | undefined, query: ListQuery): Promise<List<Study>> => {
  const id = requireId(teamId, 'team');
  authorize(ctx, 'study.read', id, 'team');
  const rows = await StudyRow.findAll({
    where: { teamId: id, ...afterCursor(query.cursor, 'createdAt') },
    order: [['createdAt', 'DESC'], ['id', 'ASC']],
    limit: query.limit + 1,
  });
  const counts = await countsOf(rows.map((row) => row.id));
  return pageOf(rows, query.limit, (row) => row.createdAt, (row) => present(row, counts.get(row.id)));
};

/** A new study of a team. */
export const createStudy = async (ctx: Context, teamId: string | undefined, input: z.output<typeof createStudySchema>): Promise<Study> => {
  const id = requireId(teamId, 'team');
  const actor = authorize(ctx, 'study.write', id, 'team');
  const study = await StudyRow.create({ ...input, teamId: id, createdBy: actor.userId });
  return present(study, (await countsOf([study.id])).get(study.id));
};

/** One study with its counts. */
export const getStudy = async (ctx: Context, studyId: string | undefined): Promise<Study> => {
  const study = await loadStudy(ctx, studyId, 'study.read');
  return present(study, (await countsOf([study.id])).get(study.id));
};

/** Changes name, description or correlation model. Versions keep the model that they were saved with. */
export const updateStudy = async (ctx: Context, studyId: string | undefined, input: z.output<typeof updateStudySchema>): Promise<Study> => {
  const study = await loadStudy(ctx, studyId, 'study.write');
  await study.update(input);
  return present(study, (await countsOf([study.id])).get(study.id));
};

/** Deletes a study with its observation sets and designs; one that has versions stays. @throws AppError IN_USE */
export const deleteStudy = async (ctx: Context, studyId: string | undefined): Promise<void> => {
  const study = await loadStudy(ctx, studyId, 'study.write');
  try {
    await getDatabase().transaction(async (transaction) => {
      const options = { replacements: { id: study.id }, transaction };
      const files = await getDatabase().query<{ id: string }>('SELECT file_id AS id FROM observation_sets WHERE study_id = :id', { ...options, type: QueryTypes.SELECT });
      await getDatabase().query('DELETE FROM designs WHERE study_id = :id', options);
      await study.destroy({ transaction });
      await StoredFile.destroy({ where: { id: files.map((file) => file.id) }, transaction });
    });
  } catch (error) {
    if (error instanceof ForeignKeyConstraintError)
      throw new AppError('IN_USE', 'This study has mesh versions, which are kept for good, so it cannot be deleted. Rename it if it is out of use.');
    throw error;
  }
};
