import { apiFetch } from '#client/api/fetch.ts';
import type { Recipe } from '#core/design/recipe.ts';
import type { Correlation } from '#schemas/correlation.ts';
import type { Design } from '#schemas/designs.ts';
import type { Job } from '#schemas/jobs.ts';
import type { ObservationSet } from '#schemas/observation-sets.ts';
import type { Study } from '#schemas/studies.ts';
import type { Version } from '#schemas/versions.ts';

/** What the designer changes of a design; `correlation` null: the study's model holds. */
export interface Draft {
  recipe: Recipe;
  correlation: Correlation | null;
}

const json = async <T>(path: string, init?: RequestInit): Promise<T> => (await (await apiFetch(path, init)).json()) as T;
const send = <T>(method: string, path: string, body: unknown): Promise<T> =>
  json<T>(path, { method, headers: { 'content-type': 'application/json' }, body: JSON.stringify(body) });

export const getDesign = (id: string): Promise<Design> => json(`/api/v1/designs/${id}`);
export const getStudy = (id: string): Promise<Study> => json(`/api/v1/studies/${id}`);
export const getObservationSet = (id: string): Promise<ObservationSet> => json(`/api/v1/observation-sets/${id}`);
export const getColumnsBundle = async (id: string): Promise<ArrayBuffer> => (await apiFetch(`/api/v1/observation-sets/${id}/columns`)).arrayBuffer();

export const patchDesign = (id: string, revision: number, draft: Draft): Promise<Design> => send('PATCH', `/api/v1/designs/${id}`, { revision, ...draft });
export const createDesign = (studyId: string, name: string, observationSetId: string, { recipe, correlation }: Draft): Promise<Design> =>
  send('POST', `/api/v1/studies/${studyId}/designs`, { name, observationSetId, recipe, ...(correlation && { correlation }) });

export const startCheck = (designId: string): Promise<Job> => send('POST', `/api/v1/designs/${designId}/checks`, {});
export const startSaveVersion = (designId: string, body: { revision: number; note: string; reason?: string }): Promise<Job> =>
  send('POST', `/api/v1/designs/${designId}/versions`, body);
export const getJob = (id: string): Promise<Job> => json(`/api/v1/jobs/${id}`);
export const cancelJob = (id: string): Promise<Job> => send('POST', `/api/v1/jobs/${id}/cancel`, {});

export const getVersion = (id: string): Promise<Version> => json(`/api/v1/versions/${id}`);
export const getMeshBundle = async (id: string): Promise<ArrayBuffer> => (await apiFetch(`/api/v1/versions/${id}/mesh`)).arrayBuffer();
