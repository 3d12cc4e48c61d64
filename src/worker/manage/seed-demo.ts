import { readFile } from 'node:fs/promises';
import path from 'node:path';

import { createDesign, getDesign, startCheck, startSaveVersion, updateDesign } from '#server/designs/designs.ts';
import type { Context } from '#server/context.ts';
import { hasAccounts, seedPeople } from '#server/demo/seed-people.ts';
import { getJob } from '#server/jobs/jobs.ts';
import { getLog } from '#server/log.ts';
import { createObservationSet } from '#server/observations/observations.ts';
import { createStudy } from '#server/studies/studies.ts';
import type { Job } from '#schemas/jobs.ts';

import { registry } from '../registry.ts';
import { runJob } from '../run-job.ts';
import { DEMO_STUDIES, type DemoDesign, type DemoStudy } from './demo-studies.ts';

/** Runs a queued job here and now; the worker later finds it done. */
const runNow = async (ctx: Context, job: Job): Promise<Record<string, unknown>> => {
  await runJob(job.id, { registry, log: getLog().child({}, { level: 'warn' }), stopping: new AbortController().signal, onAlive: async () => undefined });
  const done = await getJob(ctx, job.id);
  if (done.state !== 'complete') throw new Error(`The demonstration could not be made: ${job.kind} ended as ${done.state}: ${done.error?.message ?? ''}`);
  return done.result!;
};

const seedDesign = async (ctx: Context, studyId: string, observationSetId: string, { name, change, versions = [] }: DemoDesign): Promise<void> => {
  let design = await createDesign(ctx, studyId, { name, observationSetId });
  if (Object.keys(change).length > 0) design = await updateDesign(ctx, design.id, { revision: design.revision, recipe: { ...design.recipe, ...change } });
  await runNow(ctx, await startCheck(ctx, design.id));
  for (const { note, reason } of versions) await runNow(ctx, await startSaveVersion(ctx, design.id, { revision: (await getDesign(ctx, design.id)).revision, note, reason }));
};

const seedStudy = async (ctx: Context, teamId: string, folder: string, study: DemoStudy): Promise<void> => {
  const { id } = await createStudy(ctx, teamId, { name: study.name, description: study.description, correlation: study.correlation });
  const form = new FormData();
  form.set('file', new Blob([await readFile(path.join(folder, study.file))]), study.file);
  form.set('name', study.setName);
  if (study.mapping) form.set('mapping', JSON.stringify(study.mapping));
  const upload = await createObservationSet(ctx, id, new Request('http://localhost/', { method: 'POST', body: form }));
  const { observationSetId } = await runNow(ctx, upload);
  for (const design of study.designs) await seedDesign(ctx, id, observationSetId as string, design);
};

/** Fills an empty database with the demonstration, once; a database with accounts is left alone. Returns whether it did. */
export const seedDemo = async (password: string | undefined, folder: string): Promise<boolean> => {
  if (!password || (await hasAccounts())) return false;
  const { teamId, designer } = await seedPeople(password);
  for (const study of DEMO_STUDIES) await seedStudy(designer, teamId, folder, study);
  return true;
};
