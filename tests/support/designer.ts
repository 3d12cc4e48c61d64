import { expect, type Page } from '@playwright/test';

import type { Design } from '#schemas/designs.ts';
import type { Job } from '#schemas/jobs.ts';

interface MapStats {
  bufferUploads: number;
  commits: number;
  frames: number;
  drawnBuffers: number[];
}

/** Counters of the page's maps. */
export const stats = (page: Page): Promise<MapStats> => page.evaluate(() => structuredClone((window as unknown as { __selvageMapStats: MapStats }).__selvageMapStats));
export const sentence = (page: Page) => page.getByTestId('margin-sentence');
export const saveState = (page: Page) => page.getByTestId('save-state');
export const handle = (page: Page) => page.getByRole('slider', { name: 'Boundary: buffer distance' });

export const CORRELATION = { kind: 'scalar', daleyKm: 120, steps: 4, mass: 'consistent', normalisation: 'exact', tolerance: 0.01, sphereRadiusKm: 6371 };
export const RECIPE = { selection: { near: { km: 0, rule: 'combine' } }, outline: { kind: 'convex' }, bufferKm: 250, corners: 'round', growth: 1.2 };

/** A lattice of observations, shaken by a fixed sequence; in km. */
export const planeCsv = (columns: number, rows: number): string => {
  let seed = 1;
  const next = (): number => (seed = (seed * 48271) % 2147483647) / 2147483647;
  const lines = ['x_km,y_km,value'];
  for (let j = 0; j < rows; j++) for (let i = 0; i < columns; i++) lines.push(`${(25 * i + 8 * next()).toFixed(3)},${(25 * j + 8 * next()).toFixed(3)},1`);
  return lines.join('\n');
};

/** A study with one observation set and one design, made through the API; signed in. */
export const makeDesign = async (page: Page, csv: string, recipe: object = RECIPE): Promise<Design> => {
  const { request } = page;
  const headers = { origin: new URL(page.url() === 'about:blank' ? process.env['SELVAGE_TEST_URL']! : page.url()).origin };
  const teams = (await (await request.get('/api/v1/teams')).json()) as { items: { id: string }[] };
  const study = (await (await request.post(`/api/v1/teams/${teams.items[0].id}/studies`, { headers, data: { name: `Designer test ${Date.now()}`, correlation: CORRELATION } })).json()) as { id: string };
  const upload = await request.post(`/api/v1/studies/${study.id}/observation-sets`, {
    headers,
    multipart: { file: { name: 'lattice.csv', mimeType: 'text/csv', buffer: Buffer.from(csv) }, mapping: JSON.stringify({ coordinates: 'plane', x: 0, y: 1, value: 2, planeUnit: 'km' }) },
  });
  expect(upload.ok(), await upload.text()).toBe(true);
  const job = await finished(page, ((await upload.json()) as Job).id);
  const made = await request.post(`/api/v1/studies/${study.id}/designs`, { headers, data: { name: 'Lattice', observationSetId: job.result!['observationSetId'], recipe } });
  expect(made.ok(), await made.text()).toBe(true);
  return (await made.json()) as Design;
};

const finished = async (page: Page, id: string): Promise<Job> => {
  let job: Job | undefined;
  await expect
    .poll(async () => (job = (await (await page.request.get(`/api/v1/jobs/${id}`)).json()) as Job).state, { timeout: 60_000 })
    .toBe('complete');
  return job!;
};

/** Opens a design and waits until its first mesh is drawn. */
export const open = async (page: Page, design: Design): Promise<void> => {
  await page.goto(`/designs/${design.id}`);
  await expect(sentence(page)).toContainText('Largest boundary effect', { timeout: 30_000 });
  await expect.poll(async () => (await stats(page)).drawnBuffers.length).toBeGreaterThan(0);
};
