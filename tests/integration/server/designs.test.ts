import { createHash } from 'node:crypto';

import { afterAll, beforeAll, describe, expect, it } from 'vitest';

import { runRecipe } from '#core/design/run-recipe.ts';
import { unpackObservations } from '#core/formats/observation-bundle.ts';
import { meshBytes } from '#core/geometry/mesh-bytes.ts';
import type { Design } from '#schemas/designs.ts';
import { checkResultSchema } from '#schemas/findings.ts';
import { type Api, createTeam, signIn } from '#support/api.ts';
import { recipeOf, seeded } from '#support/meshes.ts';
import { createTestDatabase, type TestDatabase } from '#support/test-database.ts';
import { startTestServer, type TestServer } from '#support/test-server.ts';

const CORRELATION = { kind: 'scalar', daleyKm: 100, steps: 4 };

let database: TestDatabase;
let server: TestServer;
let designer: Api;
let colleague: Api;
let teamId: string;
let studyId: string;
let setId: string;

const random = seeded(21);
const csv = ['lon,lat,value', ...Array.from({ length: 300 }, () => `${(4 + 6 * random()).toFixed(6)},${(52 + 4 * random()).toFixed(6)},1`)].join('\n');

const setOf = async (text: string): Promise<string> => (await designer.complete((await designer.upload(studyId, text)).body)).observationSetId;
const designOn = (observationSetId: string, more: object = {}): Promise<Design> => designer.post(`/studies/${studyId}/designs`, { name: 'A design', observationSetId, ...more });

beforeAll(async () => {
  database = await createTestDatabase();
  server = await startTestServer({ databaseUrl: database.url, worker: true });
  const team = await createTeam(database);
  teamId = team.teamId;
  designer = await signIn(server.url, team.emails.designer);
  colleague = await signIn(server.url, team.emails.reviewer);
  studyId = (await designer.post(`/teams/${teamId}/studies`, { name: 'Designs', correlation: CORRELATION })).id;
  setId = await setOf(csv);
}, 120_000);

afterAll(async () => {
  await server?.stop();
  await database?.drop();
});

describe('a design', () => {
  it('starts from a recipe derived from observations and model, and passes its check', async () => {
    const design = await designOn(setId);
    expect(design).toMatchObject({ revision: 1, correlation: null, effectiveCorrelation: { daleyKm: 100, steps: 4, tolerance: 0.01 }, lastCheck: null, updatedBy: { name: 'designer 1' } });
    expect(design.recipe).toMatchObject({ outline: { kind: 'convex' }, corners: 'round', growth: 1.2 });
    const result = checkResultSchema.parse(await designer.complete(await designer.post(`/designs/${design.id}/checks`)));
    expect(result.findings.filter((finding) => finding.verdict === 'fail').map((finding) => finding.id)).toEqual([]);
    expect(await designer.get(`/designs/${design.id}/checks`)).toEqual(result);
    expect((await designer.get(`/designs/${design.id}`)).lastCheck).toMatchObject({ revision: 1, state: 'complete' });
  });

  it('gives the same mesh on the server as from the same code elsewhere', async () => {
    const design = await designOn(setId, { recipe: recipeOf({ bufferKm: 200, corners: 'square' }) });
    const result = await designer.complete(await designer.post(`/designs/${design.id}/checks`));
    const columns = unpackObservations((await designer.bytes(`/observation-sets/${setId}/columns`)).body);
    const { mesh } = runRecipe(columns, design.recipe, { sphereRadiusKm: design.effectiveCorrelation.sphereRadiusKm });
    expect(result.meshHash).toBe(createHash('sha256').update(meshBytes(mesh)).digest('hex'));
  });

  it('takes a model of its own and gives it up again', async () => {
    const design = await designOn(setId, { correlation: { kind: 'scalar', scaleKm: 20, steps: 2 } });
    expect(design.effectiveCorrelation).toMatchObject({ scaleKm: 20, steps: 2 });
    const back = await designer.patch(`/designs/${design.id}`, { revision: 1, correlation: null });
    expect(back).toMatchObject({ revision: 2, correlation: null, effectiveCorrelation: { daleyKm: 100 } });
  });

  it('is listed newest first, page by page, and can be deleted', async () => {
    const study = await designer.post(`/teams/${teamId}/studies`, { name: 'Many', correlation: CORRELATION });
    const observationSetId = (await designer.complete((await designer.upload(study.id, csv)).body)).observationSetId;
    const names = ['one', 'two', 'three', 'four', 'five'];
    for (const name of names) await designer.post(`/studies/${study.id}/designs`, { name, observationSetId });
    const seen: string[] = [];
    for (let cursor = ''; ; ) {
      const page = await designer.get(`/studies/${study.id}/designs?limit=2${cursor}`);
      seen.push(...page.items.map((design: Design) => design.name));
      if (page.nextCursor === null) break;
      cursor = `&cursor=${page.nextCursor}`;
    }
    expect(seen).toEqual([...names].reverse());
    const [newest] = (await designer.get(`/studies/${study.id}/designs?limit=1`)).items;
    expect((await designer.ask('DELETE', `/designs/${newest.id}`)).status).toBe(204);
    expect((await designer.ask('GET', `/designs/${newest.id}`)).status).toBe(404);
  });

  it('refuses an observation set of another study, a wrong recipe and a wrong model, field by field', async () => {
    const other = await designer.post(`/teams/${teamId}/studies`, { name: 'Other', correlation: CORRELATION });
    expect(await designer.refused('POST', `/studies/${other.id}/designs`, { name: 'x', observationSetId: setId })).toMatchObject({ code: 'VALIDATION_FAILED', fields: [{ path: 'observationSetId' }] });
    const wrong = await designer.refused('POST', `/studies/${studyId}/designs`, { name: 'x', observationSetId: setId, recipe: { ...recipeOf({ bufferKm: -1 }), growth: 9 } });
    expect(wrong.fields!.map((field) => field.path).sort()).toEqual(['recipe.bufferKm', 'recipe.growth']);
    const both = await designer.refused('POST', `/studies/${studyId}/designs`, { name: 'x', observationSetId: setId, correlation: { kind: 'scalar', daleyKm: 1, scaleKm: 1, steps: 4 } });
    expect(both).toMatchObject({ status: 422, detail: expect.stringContaining('either the Daley length or the diffusion scale') });
    expect(await designer.refused('POST', `/studies/${studyId}/designs`, { name: 'a\u0000b', observationSetId: setId })).toMatchObject({ status: 422, detail: expect.stringContaining('null character') });
  });
});

describe('two people at one design', () => {
  it('the later save of an older revision is refused and gets the newer design; neither is lost', async () => {
    const design = await designOn(setId);
    const mine = await designer.patch(`/designs/${design.id}`, { revision: 1, recipe: { ...design.recipe, bufferKm: 111 } });
    const theirs = await colleague.refused('PATCH', `/designs/${design.id}`, { revision: 1, recipe: { ...design.recipe, bufferKm: 222 } });
    expect(theirs).toMatchObject({ status: 409, code: 'DESIGN_CHANGED', detail: expect.stringContaining('designer 1 saved this design meanwhile') });
    expect(theirs.details!['current']).toEqual(mine);
    expect((await colleague.get(`/designs/${design.id}`)).recipe.bufferKm).toBe(111);
    const kept = await colleague.post(`/studies/${studyId}/designs`, { name: 'Theirs', observationSetId: setId, recipe: { ...design.recipe, bufferKm: 222 } });
    expect(kept.recipe.bufferKm).toBe(222);
  });

  it('of many saves at once exactly one wins', async () => {
    const design = await designOn(setId);
    const answers = await Promise.all(Array.from({ length: 8 }, (_, k) => (k % 2 ? designer : colleague).ask('PATCH', `/designs/${design.id}`, { revision: 1, name: `Save ${k}` })));
    expect(answers.map((answer) => answer.status).sort()).toEqual([200, ...Array(7).fill(409)]);
    const winner = answers.find((answer) => answer.status === 200)!.body;
    expect(await designer.get(`/designs/${design.id}`)).toEqual(winner);
    expect(winner.revision).toBe(2);
  });

  it('a version is not saved of a design that is no longer the one seen', async () => {
    const design = await designOn(setId);
    await colleague.patch(`/designs/${design.id}`, { revision: 1, name: 'Renamed' });
    expect(await designer.refused('POST', `/designs/${design.id}/versions`, { revision: 1 })).toMatchObject({ code: 'DESIGN_CHANGED', details: { current: { name: 'Renamed' } } });
  });
});

describe('observations that no mesh can be made of', () => {
  it.each([
    ['one point', 'lon,lat\n5,55\n', /TOO_FEW_POINTS|POINTS_COLLINEAR/],
    ['two observations at one place', 'lon,lat\n5,55\n5,55\n', /TOO_FEW_POINTS|POINTS_COLLINEAR/],
    ['three collinear points', 'x,y\n0,0\n50,50\n100,100\n', /POINTS_COLLINEAR/],
  ])('%s: a mesh or a message that says what to do, and no crash', async (_what, text, code) => {
    const design = await designOn(await setOf(text));
    const job = await designer.finish(await designer.post(`/designs/${design.id}/checks`));
    if (job.state === 'complete') {
      // a buffer round a point or a line is a sound domain
      const validity = checkResultSchema.parse(job.result).findings.filter((finding) => finding.group === 'validity');
      expect(validity.filter((finding) => finding.verdict === 'fail').map((finding) => finding.id)).toEqual([]);
      return;
    }
    expect(job.error!.code).toMatch(code);
    expect(job.error!.message).toMatch(/(Select|Add) .*observations? /);
    expect(await designer.get(`/designs/${design.id}/checks`)).toBeNull();
  });

  it('near observations that are to be refused are named', async () => {
    const design = await designOn(await setOf('x,y\n0,0\n0,0.5\n100,0\n0,100\n'), { recipe: { ...recipeOf({ bufferKm: 100 }), selection: { near: { km: 1, rule: 'refuse' } } } });
    const job = await designer.finish(await designer.post(`/designs/${design.id}/checks`));
    expect(job.state).toBe('failed');
    expect(job.error).toMatchObject({ code: 'POINTS_TOO_CLOSE' });
  });

  it('a selection that keeps nothing says so', async () => {
    const design = await designOn(setId, { recipe: { ...recipeOf({ bufferKm: 100 }), selection: { near: { km: 0, rule: 'combine' }, keepInside: [[100, 0], [101, 0], [101, 1]] } } });
    const job = await designer.finish(await designer.post(`/designs/${design.id}/checks`));
    expect(job.error).toMatchObject({ code: 'SELECTION_EMPTY' });
  });
});
