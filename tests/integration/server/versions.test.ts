import { createHash } from 'node:crypto';
import { readFileSync } from 'node:fs';
import { createRequire } from 'node:module';

import { strFromU8, unzipSync } from 'fflate';
import { NetCDFReader } from 'netcdfjs';
import pg from 'pg';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';

import { runRecipe } from '#core/design/run-recipe.ts';
import { unpackMesh } from '#core/formats/mesh-bundle.ts';
import { unpackObservations } from '#core/formats/observation-bundle.ts';
import { meshBytes } from '#core/geometry/mesh-bytes.ts';
import { elementQuality } from '#core/geometry/quality.ts';
import type { Design } from '#schemas/designs.ts';
import { CAUTION, rebuildResultSchema, type Version } from '#schemas/versions.ts';
import { type Api, createTeam, signIn } from '#support/api.ts';
import { recipeOf, seeded } from '#support/meshes.ts';
import { createTestDatabase, type TestDatabase } from '#support/test-database.ts';
import { startTestServer, type TestServer } from '#support/test-server.ts';

const sha256 = (bytes: Uint8Array | string): string => createHash('sha256').update(bytes).digest('hex');
const CORRELATION = { kind: 'scalar', daleyKm: 100, steps: 4 };

let database: TestDatabase;
let server: TestServer;
let api: Api;
let teamId: string;

beforeAll(async () => {
  database = await createTestDatabase();
  server = await startTestServer({ databaseUrl: database.url, worker: true });
  const team = await createTeam(database);
  teamId = team.teamId;
  api = await signIn(server.url, team.emails.designer);
}, 120_000);

afterAll(async () => {
  await server?.stop();
  await database?.drop();
});

const random = seeded(8);
const places = Array.from({ length: 200 }, (): [number, number] => [4 + 6 * random(), 52 + 4 * random()]);
const csv = ['lon,lat,value', ...places.map(([lon, lat], i) => `${lon},${lat},${i}`)].join('\n');

const studyOf = (name: string): Promise<{ id: string }> => api.post(`/teams/${teamId}/studies`, { name, correlation: CORRELATION });
const setOf = async (studyId: string, text: Uint8Array | string, fileName?: string): Promise<string> => (await api.complete((await api.upload(studyId, text, { fileName })).body)).observationSetId;
const designOf = (studyId: string, observationSetId: string, more: object = {}): Promise<Design> => api.post(`/studies/${studyId}/designs`, { name: 'North Sea, first try', observationSetId, ...more });
const saved = async (design: Design, more: object = {}): Promise<Version> => api.get(`/versions/${(await api.complete(await api.post(`/designs/${design.id}/versions`, { revision: design.revision, ...more }))).versionId}`);

/** Rows and columns from 1, value, of a Matrix Market file. */
const entriesOf = (text: string): number[][] => text.trimEnd().split('\n').filter((line) => !line.startsWith('%')).slice(1).map((line) => line.split(' ').map(Number));
/** Sum of all entries of a symmetric matrix of which the lower triangle is written. */
const totalOf = (text: string): number => entriesOf(text).reduce((sum, [i, j, value]) => sum + (i === j ? value : 2 * value), 0);

describe('a version', () => {
  let study: { id: string };
  let setId: string;
  let design: Design;
  let version: Version;
  beforeAll(async () => {
    study = await studyOf('Versions');
    setId = await setOf(study.id, csv, 'buoys.csv');
    design = await designOf(study.id, setId);
    version = await saved(design, { note: '  the first  ' });
  });

  it('keeps recipe, model, findings, figures, who and when, and the hash of what it was made of', async () => {
    expect(version).toMatchObject({ number: 1, state: 'saved', designName: design.name, designId: design.id, recipe: design.recipe, correlation: design.effectiveCorrelation, note: 'the first', waiver: null, observationSha256: sha256(csv), caution: CAUTION, savedBy: { name: 'designer 1' } });
    expect(['pass', 'warn']).toContain(version.verdict);
    expect(version.softwareVersion).toMatch(/^Selvage \d/);
    expect(version.findings.length).toBeGreaterThan(8);
    expect((await api.get(`/versions/${version.id}/findings`)).items).toEqual(version.findings);
    expect((await api.get(`/studies/${study.id}/versions`)).items).toHaveLength(1);
    expect(Math.abs(Date.now() - Date.parse(version.savedAt))).toBeLessThan(60_000);
  });

  it('gives its mesh, whose hash it carries, and which the same code makes elsewhere', async () => {
    const bundle = await api.bytes(`/versions/${version.id}/mesh`);
    const { mesh, selected } = unpackMesh(bundle.body);
    expect(sha256(meshBytes(mesh))).toBe(version.meshHash);
    expect([mesh.nodeKind.length, mesh.triangles.length / 3]).toEqual([version.nodes, version.elements]);
    const columns = unpackObservations((await api.bytes(`/observation-sets/${setId}/columns`)).body);
    const again = runRecipe(columns, version.recipe, { sphereRadiusKm: 6371 });
    expect(again.mesh).toEqual(mesh);
    expect(again.selected).toEqual(selected);
  });

  it('exports NetCDF, Matrix Market and GeoJSON that other readers read, the same bytes every time', async () => {
    const { mesh } = unpackMesh((await api.bytes(`/versions/${version.id}/mesh`)).body);
    const { items } = await api.get(`/versions/${version.id}/exports`);
    expect(items.map((entry: any) => entry.format)).toEqual(['netcdf', 'matrix-market', 'geojson']);
    const files = new Map<string, Uint8Array>();
    for (const { format, sha256: hash, fileName, mediaType, url } of items) {
      const file = await api.bytes(url.replace('/api/v1', ''));
      expect(sha256(file.body)).toBe(hash);
      expect(file.headers.get('etag')).toBe(`"${hash}"`);
      expect(file.headers.get('content-type')).toBe(mediaType);
      expect(file.headers.get('content-disposition')).toContain(`filename="${fileName}"`);
      expect(fileName).toMatch(/^north-sea-first-try-v1/);
      expect(sha256((await api.bytes(url.replace('/api/v1', ''))).body)).toBe(hash);
      const known = await fetch(`${server.url}${url}`, { headers: { ...api.headers, 'if-none-match': `"${hash}"` } });
      expect(known.status).toBe(304);
      files.set(format, file.body);
    }

    const netcdf = new NetCDFReader(files.get('netcdf')!);
    expect(netcdf.getAttribute('mesh_sha256')).toBe(version.meshHash);
    expect(netcdf.getAttribute('history')).toBe(`${version.savedAt}: saved as version 1`);
    const lon = netcdf.getDataVariable('node_lon') as number[];
    const lat = netcdf.getDataVariable('node_lat') as number[];
    expect(lon.flatMap((value, i) => [value, lat[i]])).toEqual([...mesh.coordinates]);
    expect(netcdf.getDataVariable('face_nodes')).toEqual([...mesh.triangles]);

    const matrices = unzipSync(files.get('matrix-market')!);
    const area = elementQuality(mesh).areaKm2.reduce((sum, value) => sum + value, 0);
    expect(totalOf(strFromU8(matrices['mass.mtx'])) / area).toBeCloseTo(1, 12);
    expect(totalOf(strFromU8(matrices['lumped-mass.mtx'])) / area).toBeCloseTo(1, 12);
    expect(Math.abs(totalOf(strFromU8(matrices['stiffness.mtx'])))).toBeLessThan(1e-9);
    expect(strFromU8(matrices['mass.mtx'])).toContain('% Indices count from 1');

    const geojson = JSON.parse(strFromU8(files.get('geojson')!));
    const roles = geojson.features.map((feature: any) => feature.properties.role as string);
    expect(roles.filter((role: string) => role === 'element')).toHaveLength(version.elements);
    expect(geojson.meshSha256).toBe(version.meshHash);
    for (const text of [netcdf.getAttribute('comment'), geojson.caution, strFromU8(matrices['stiffness.mtx'])]) expect(text).toContain('must be validated in the receiving assimilation system');
  });

  it('has no export of another format, and no GeoJSON in the plane', async () => {
    expect(await api.refused('GET', `/versions/${version.id}/exports/shapefile`)).toMatchObject({ status: 404 });
    const planeSet = await setOf(study.id, `x_km,y_km\n${places.map(([x, y]) => `${(100 * x).toFixed(3)},${(100 * y).toFixed(3)}`).join('\n')}`);
    const plane = await saved(await designOf(study.id, planeSet));
    expect((await api.get(`/versions/${plane.id}/exports`)).items.map((entry: any) => entry.format)).toEqual(['netcdf', 'matrix-market']);
    expect(await api.refused('GET', `/versions/${plane.id}/exports/geojson`)).toMatchObject({ status: 404 });
  });

  it('keeps what it is when its design goes on and goes away, and keeps its set and study from being deleted', async () => {
    const other = await designOf(study.id, setId);
    const before = await saved(other);
    await api.patch(`/designs/${other.id}`, { revision: 1, recipe: { ...other.recipe, bufferKm: 999 } });
    expect((await api.ask('DELETE', `/designs/${other.id}`)).status).toBe(204);
    expect(await api.get(`/versions/${before.id}`)).toEqual(before);
    expect(await api.refused('DELETE', `/observation-sets/${setId}`)).toMatchObject({ code: 'IN_USE' });
    expect(await api.refused('DELETE', `/studies/${study.id}`)).toMatchObject({ code: 'IN_USE' });
    expect(await api.get(`/versions/${before.id}`)).toEqual(before);
  });

  it('cannot be changed or deleted in the database: not by the program’s role, not by the owner', async () => {
    const run = async (role: string | null, sql: string): Promise<unknown> => {
      const client = new pg.Client({ connectionString: database.url });
      await client.connect();
      try {
        if (role !== null) await client.query(`SET ROLE ${role}`);
        return await client.query(sql);
      } finally {
        await client.end();
      }
    };
    for (const table of ['mesh_versions', 'export_files']) {
      const column = table === 'mesh_versions' ? 'note' : 'file_name';
      for (const sql of [`UPDATE ${table} SET ${column} = 'x'`, `DELETE FROM ${table}`, `TRUNCATE ${table} CASCADE`]) {
        await expect(run('selvage_runtime', sql), sql).rejects.toThrow(/permission denied/);
        await expect(run(null, sql), sql).rejects.toThrow(/never change/);
      }
    }
    for (const table of ['stored_files', 'stored_file_chunks', 'rejected_rows']) await expect(run('selvage_runtime', `UPDATE ${table} SET ${table === 'rejected_rows' ? 'reason' : table === 'stored_files' ? 'file_name' : 'bytes'} = ''`)).rejects.toThrow(/permission denied/);
    expect(await api.get(`/versions/${version.id}`)).toEqual(version);
  });
});

describe('saving', () => {
  it('is refused while a finding fails, and a reason given is kept with the version', async () => {
    const study = await studyOf('Failing');
    const design = await designOf(study.id, await setOf(study.id, csv), { recipe: recipeOf({ bufferKm: 40 }) });
    const job = await api.finish(await api.post(`/designs/${design.id}/versions`, { revision: 1 }));
    expect(job).toMatchObject({ state: 'failed', error: { code: 'FINDINGS_FAIL', message: expect.stringMatching(/fail.*Change the design, or save again with the reason/s) } });
    const failing = job.error!.details!['findings'] as string[];
    expect(failing.length).toBeGreaterThan(0);
    expect((await api.get(`/studies/${study.id}/versions`)).items).toEqual([]);
    expect(await api.refused('POST', `/designs/${design.id}/versions`, { revision: 1, reason: '   ' })).toMatchObject({ status: 422 });
    const version = await saved(design, { reason: 'To show what a boundary too close does.' });
    expect(version).toMatchObject({ number: 1, verdict: 'fail', waiver: 'To show what a boundary too close does.' });
    expect(version.findings.filter((finding) => finding.verdict === 'fail').map((finding) => finding.id)).toEqual(failing);
  });

  it('of many at once numbers them one after the other, each number once', async () => {
    const study = await studyOf('Numbers');
    const design = await designOf(study.id, await setOf(study.id, csv));
    const jobs = await Promise.all(Array.from({ length: 6 }, () => api.post(`/designs/${design.id}/versions`, { revision: 1 })));
    const results = await Promise.all(jobs.map((job) => api.complete(job)));
    expect(results.map((result) => result.number).sort()).toEqual([1, 2, 3, 4, 5, 6]);
    expect(new Set(results.map((result) => result.meshHash)).size).toBe(1);
    const { items } = await api.get(`/studies/${study.id}/versions`);
    expect(items.map((version: Version) => version.number).sort()).toEqual([1, 2, 3, 4, 5, 6]);
  });
});

describe('a rebuild', () => {
  const overwrite = async (sql: string, values: unknown[]): Promise<void> => {
    const client = new pg.Client({ connectionString: database.adminUrl });
    await client.connect();
    try {
      await client.query('SET session_replication_role = replica');
      await client.query(sql, values);
    } finally {
      await client.end();
    }
  };
  const rebuilt = async (version: Version) => rebuildResultSchema.parse(await api.complete(await api.post(`/versions/${version.id}/rebuild`)));

  it('reproduces the hash from the original bytes and the recipe, with the stored arrays made unreadable', async () => {
    const study = await studyOf('Rebuild');
    const setId = await setOf(study.id, csv);
    const version = await saved(await designOf(study.id, setId));
    await overwrite('UPDATE mesh_versions SET arrays = $1 WHERE id = $2', [Buffer.from('no arrays'), version.id]);
    await overwrite('UPDATE observation_sets SET columns_bundle = $1 WHERE id = $2', [Buffer.from('no columns'), setId]);
    expect(await rebuilt(version)).toEqual({ expectedHash: version.meshHash, rebuiltHash: version.meshHash, reproduced: true, observationSha256: sha256(csv) });
  });

  it('tells when one observation differs by one unit in the last place', async () => {
    const study = await studyOf('Last place');
    const setId = await setOf(study.id, csv);
    const version = await saved(await designOf(study.id, setId));
    const [lon] = places[77];
    const bits = new Float64Array([lon]);
    new BigInt64Array(bits.buffer)[0] += 1n;
    const changed = csv.replace(`\n${lon},`, `\n${bits[0]},`);
    expect(changed).not.toBe(csv);
    await overwrite('UPDATE stored_file_chunks SET bytes = $1 WHERE file_id = (SELECT file_id FROM observation_sets WHERE id = $2)', [Buffer.from(changed), setId]);
    const result = await rebuilt(version);
    expect(result).toMatchObject({ expectedHash: version.meshHash, reproduced: false, observationSha256: sha256(changed) });
    expect(result.rebuiltHash).not.toBe(version.meshHash);
  });

  it('reproduces a mapping that was chosen, a selection and combined observations', async () => {
    const study = await studyOf('Rebuild with all');
    const text = `a;b;q;s\n${places.map(([x, y], i) => `${(1e5 * x).toFixed(1)};${(1e5 * y).toFixed(1)};${i % 9 ? 'good' : 'bad'};0.${1 + (i % 7)}`).join('\n').replaceAll('.', ',')}`;
    const { body } = await api.upload(study.id, text, { mapping: { coordinates: 'plane', planeUnit: 'm', x: 0, y: 1, flag: 2, errorSd: 3 } });
    const { observationSetId } = await api.complete(body);
    const recipe = { ...recipeOf({ bufferKm: 260 }), selection: { flags: ['good'], near: { km: 8, rule: 'combine' } } };
    const version = await saved(await designOf(study.id, observationSetId, { recipe }), { reason: 'whatever it finds' });
    expect(version.figures.observations).toBeLessThan(version.figures.rowsSelected);
    expect((await rebuilt(version)).reproduced).toBe(true);
  });
});

describe('a real data set', () => {
  it('goes all the way: airports of the contiguous states, uploaded, designed, checked, saved, exported, read back, rebuilt', async () => {
    const bytes = readFileSync(createRequire(import.meta.url).resolve('vega-datasets/data/airports.csv'));
    const study = await api.post(`/teams/${teamId}/studies`, { name: 'Airports', correlation: { kind: 'scalar', daleyKm: 250, steps: 4 } });
    const result = await api.complete((await api.upload(study.id, bytes, { fileName: 'airports.csv' })).body);
    expect(result).toMatchObject({ rowsRead: 3376, accepted: 3376, rejectedCount: 0 });
    const set = await api.get(`/observation-sets/${result.observationSetId}`);
    expect(set).toMatchObject({ crs: 'lonlat-deg', sha256: sha256(bytes) });

    const start = await designOf(study.id, set.id);
    const keepInside = [[-125.5, 24], [-66, 24], [-66, 49.6], [-125.5, 49.6]];
    const design = await api.patch(`/designs/${start.id}`, { revision: 1, recipe: { ...start.recipe, selection: { ...start.recipe.selection, near: { km: 5, rule: 'combine' }, keepInside } } });
    const check = await api.complete(await api.post(`/designs/${design.id}/checks`));
    expect(check.findings.filter((finding: any) => finding.group === 'validity' && finding.verdict !== 'pass')).toEqual([]);
    const version = await saved(design, { reason: 'Airports thin out in the desert.' });
    expect(version.meshHash).toBe(check.meshHash);

    // how many rows lie inside, counted from the file itself
    const rows = bytes.toString().trimEnd().split('\n').slice(1).map((line) => line.split(',').slice(-2).map(Number));
    const inside = rows.filter(([lat, lon]) => lon > -125.5 && lon < -66 && lat > 24 && lat < 49.6).length;
    expect(Math.abs(version.figures.rowsSelected - inside)).toBeLessThanOrEqual(3);

    const netcdf = new NetCDFReader((await api.bytes(`/versions/${version.id}/exports/netcdf`)).body);
    const lon = netcdf.getDataVariable('node_lon') as number[];
    const lat = netcdf.getDataVariable('node_lat') as number[];
    const nodes = netcdf.getDataVariable('observation_node') as number[];
    expect(nodes).toHaveLength(version.figures.observations);
    const counts = netcdf.getDataVariable('observation_row_count') as number[];
    expect(counts.reduce((sum, count) => sum + count, 0)).toBe(version.figures.rowsSelected);
    // observations that are one row stand where the file says, to the last bit
    const known = new Set(rows.map(([y, x]) => `${x},${y}`));
    for (const [i, node] of nodes.entries()) if (counts[i] === 1) expect(known.has(`${lon[node]},${lat[node]}`)).toBe(true);
    const rebuild = await api.complete(await api.post(`/versions/${version.id}/rebuild`));
    expect(rebuild.reproduced).toBe(true);
  }, 120_000);
});
