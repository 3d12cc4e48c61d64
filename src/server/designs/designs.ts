import type { z } from 'zod/v4';

import { defaultRecipe } from '#core/design/default-recipe.ts';
import type { Recipe } from '#core/design/recipe.ts';
import { unpackObservations } from '#core/formats/observation-bundle.ts';
import { DesignRow } from '#db/models/DesignRow.ts';
import { JobRow } from '#db/models/JobRow.ts';
import { Study as StudyRow } from '#db/models/Study.ts';
import { User } from '#db/models/User.ts';
import type { Correlation } from '#schemas/correlation.ts';
import type { createDesignSchema, Design, updateDesignSchema } from '#schemas/designs.ts';
import { type CheckResult, checkResultSchema } from '#schemas/findings.ts';
import type { Job } from '#schemas/jobs.ts';
import type { List, ListQuery } from '#schemas/list.ts';
import type { saveVersionSchema } from '#schemas/versions.ts';

import type { Context } from '../context.ts';
import { getDatabase, inTransaction } from '../database.ts';
import { AppError, notFound } from '../errors.ts';
import { enqueueJob } from '../jobs/jobs.ts';
import { loadObservationSet } from '../observations/observations.ts';
import { afterCursor, pageOf, requireId } from '../pages-of-lists.ts';
import { type Action, authorize } from '../policies.ts';
import { loadStudy } from '../studies/studies.ts';

const presentAll = async (rows: DesignRow[]): Promise<Design[]> => {
  const by = <T extends { id: string }>(list: T[]): Map<string, T> => new Map(list.map((one) => [one.id, one]));
  const users = by(await User.findAll({ where: { id: rows.flatMap((row) => row.updatedBy ?? []) } }));
  const jobs = by(await JobRow.findAll({ where: { id: rows.flatMap((row) => row.checkJobId ?? []) }, attributes: ['id', 'state'] }));
  const studies = by(await StudyRow.findAll({ where: { id: rows.map((row) => row.studyId) } }));
  return rows.map((row) => {
    const job = jobs.get(row.checkJobId ?? '');
    return {
      id: row.id,
      studyId: row.studyId,
      name: row.name,
      observationSetId: row.observationSetId,
      recipe: row.recipe,
      correlation: row.correlation,
      effectiveCorrelation: row.correlation ?? studies.get(row.studyId)!.correlation,
      revision: row.revision,
      updatedBy: { id: row.updatedBy ?? '', name: users.get(row.updatedBy ?? '')?.name ?? 'somebody who left' },
      updatedAt: row.updatedAt.toISOString(),
      createdAt: row.createdAt.toISOString(),
      lastCheck: job ? { jobId: job.id, revision: row.checkRevision ?? 0, state: job.state } : null,
    };
  });
};

const present = async (row: DesignRow): Promise<Design> => (await presentAll([row]))[0];

const loadDesign = async (ctx: Context, designId: string | undefined, action: Action): Promise<DesignRow> => {
  const id = requireId(designId, 'design');
  getDatabase();
  const row = await DesignRow.findByPk(id);
  authorize(ctx, action, row?.teamId ?? '', 'design');
  if (!row) throw notFound('design');
  return row;
};

/** Designs of a study, newest first. */
export const listDesigns = async (ctx: Context, studyId: string | undefined, query: ListQuery): Promise<List<Design>> => {
  const study = await loadStudy(ctx, studyId, 'design.read');
  const rows = await DesignRow.findAll({
    where: { studyId: study.id, ...afterCursor(query.cursor, 'createdAt') },
    order: [['createdAt', 'DESC'], ['id', 'ASC']],
    limit: query.limit + 1,
  });
  const shown = new Map((await presentAll(rows)).map((design) => [design.id, design]));
  return pageOf(rows, query.limit, (row) => row.createdAt, (row) => shown.get(row.id)!);
};

/** A new design on an observation set of the same study; without a recipe it starts from `defaultRecipe`. */
export const createDesign = async (ctx: Context, studyId: string | undefined, input: z.output<typeof createDesignSchema>): Promise<Design> => {
  const study = await loadStudy(ctx, studyId, 'design.write');
  const set = await loadObservationSet(ctx, input.observationSetId, 'observations.read', input.recipe === undefined);
  if (set.studyId !== study.id)
    throw new AppError('VALIDATION_FAILED', 'The observation set belongs to another study. Choose one of this study.', {
      fields: [{ path: 'observationSetId', message: 'This observation set belongs to another study.' }],
    });
  const recipe: Recipe = input.recipe ?? defaultRecipe(unpackObservations(set.columnsBundle), input.correlation ?? study.correlation);
  const row = await DesignRow.create({
    teamId: study.teamId,
    studyId: study.id,
    observationSetId: set.id,
    name: input.name,
    recipe,
    correlation: input.correlation ?? null,
    revision: 1,
    updatedBy: ctx.actor!.userId,
  });
  return present(row);
};

/** One design. */
export const getDesign = async (ctx: Context, designId: string | undefined): Promise<Design> => present(await loadDesign(ctx, designId, 'design.read'));

/**
 * Changes a design that still has the revision the client started from.
 * @throws AppError DESIGN_CHANGED with the newer design in `details.current`; nothing is overwritten
 */
export const updateDesign = async (ctx: Context, designId: string | undefined, input: z.output<typeof updateDesignSchema>): Promise<Design> => {
  const row = await loadDesign(ctx, designId, 'design.write');
  const { revision, ...changes } = input;
  const [count] = await DesignRow.update({ ...changes, revision: revision + 1, updatedBy: ctx.actor!.userId }, { where: { id: row.id, revision } });
  await row.reload();
  const current = await present(row);
  if (count === 0)
    throw new AppError('DESIGN_CHANGED', `${current.updatedBy.name} saved this design meanwhile, so your change was not stored. Choose which of the two to keep.`, { details: { current } });
  return current;
};

/** Deletes a design; versions saved from it stay. */
export const deleteDesign = async (ctx: Context, designId: string | undefined): Promise<void> => {
  await (await loadDesign(ctx, designId, 'design.write')).destroy();
};

const effectiveModel = async (row: DesignRow): Promise<Correlation> => row.correlation ?? (await StudyRow.findByPk(row.studyId))!.correlation;

/** Queues the check of the design as it stands. */
export const startCheck = async (ctx: Context, designId: string | undefined): Promise<Job> => {
  const row = await loadDesign(ctx, designId, 'design.write');
  const payload = { observationSetId: row.observationSetId, recipe: row.recipe, correlation: await effectiveModel(row), revision: row.revision };
  return inTransaction(async (transaction) => {
    const job = await enqueueJob(ctx, { kind: 'check-design', teamId: row.teamId, payload, transaction });
    await DesignRow.update({ checkJobId: job.id, checkRevision: row.revision }, { where: { id: row.id }, transaction, silent: true });
    return job;
  });
};

/** Result of the newest check, null when there is none or it has not succeeded. */
export const getLastCheck = async (ctx: Context, designId: string | undefined): Promise<CheckResult | null> => {
  const row = await loadDesign(ctx, designId, 'design.read');
  const job = row.checkJobId ? await JobRow.findByPk(row.checkJobId) : null;
  return job?.state === 'complete' ? checkResultSchema.parse(job.result) : null;
};

/**
 * Queues the saving of a version. The worker rebuilds and checks; it refuses (FINDINGS_FAIL) when a finding fails and no
 * reason was given. @throws AppError DESIGN_CHANGED when the design has another revision than the person saw
 */
export const startSaveVersion = async (ctx: Context, designId: string | undefined, input: z.output<typeof saveVersionSchema>): Promise<Job> => {
  const row = await loadDesign(ctx, designId, 'version.write');
  if (row.revision !== input.revision)
    throw new AppError('DESIGN_CHANGED', 'The design changed after you looked at it. Look at it again and save then.', { details: { current: await present(row) } });
  const payload = {
    designId: row.id,
    designName: row.name,
    studyId: row.studyId,
    observationSetId: row.observationSetId,
    recipe: row.recipe,
    correlation: await effectiveModel(row),
    note: input.note,
    reason: input.reason ?? null,
    userName: ctx.actor!.name,
  };
  return inTransaction((transaction) => enqueueJob(ctx, { kind: 'save-version', teamId: row.teamId, payload, transaction }));
};
