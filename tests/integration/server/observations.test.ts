import { createHash } from 'node:crypto';
import { mkdtempSync, readdirSync, readFileSync, rmSync } from 'node:fs';
import http from 'node:http';
import { tmpdir } from 'node:os';
import path from 'node:path';

import { afterAll, beforeAll, describe, expect, it } from 'vitest';

import { unpackObservations } from '#core/formats/observation-bundle.ts';
import type { Job } from '#schemas/jobs.ts';
import { type Api, createTeam, signIn, type TestTeam } from '#support/api.ts';
import { createTestDatabase, type TestDatabase } from '#support/test-database.ts';
import { startTestServer, type TestServer } from '#support/test-server.ts';

const LIMIT_MB = 24;
const NEEDS_BUILD = 'the development server takes bodies its own way: run "npm run build" first';
const sample = (name: string): Uint8Array => new Uint8Array(readFileSync(new URL(`../../../fixtures/samples/${name}`, import.meta.url)));
const sha256 = (bytes: Uint8Array | string): string => createHash('sha256').update(bytes).digest('hex');

let database: TestDatabase;
let server: TestServer;
let temporary: string;
let team: TestTeam;
let api: Api;
let studyId: string;

beforeAll(async () => {
  temporary = mkdtempSync(path.join(tmpdir(), 'selvage-uploads-'));
  database = await createTestDatabase();
  server = await startTestServer({ databaseUrl: database.url, worker: true, env: { SELVAGE_UPLOAD_LIMIT_MB: String(LIMIT_MB), TMPDIR: temporary } });
  team = await createTeam(database);
  api = await signIn(server.url, team.emails.designer);
  studyId = (await api.post(`/teams/${team.teamId}/studies`, { name: 'Uploads', correlation: { kind: 'scalar', daleyKm: 100, steps: 4 } })).id;
}, 120_000);

afterAll(async () => {
  await server?.stop();
  await database?.drop();
  rmSync(temporary, { recursive: true, force: true });
});

const uploaded = async (content: Uint8Array | string, options: Parameters<Api['upload']>[2] = {}): Promise<Job> => {
  const answer = await api.upload(studyId, content, options);
  expect(answer.status, JSON.stringify(answer.body)).toBe(202);
  expect(answer.headers.get('location')).toBe(`/api/v1/jobs/${answer.body.id}`);
  return answer.body as Job;
};
const setOf = async (content: Uint8Array | string, options: Parameters<Api['upload']>[2] = {}): Promise<string> => (await api.complete(await uploaded(content, options))).observationSetId;

/** Rows of every table that an upload writes, and temporary files. */
const traces = async (): Promise<Record<string, number>> => {
  const [row] = await database.query<Record<string, number>>(
    `SELECT (SELECT count(*)::int FROM stored_files) AS files, (SELECT count(*)::int FROM stored_file_chunks) AS chunks,
            (SELECT count(*)::int FROM observation_sets) AS sets, (SELECT count(*)::int FROM rejected_rows) AS rejected`,
  );
  return { ...row, temporary: readdirSync(temporary).filter((name) => name.startsWith('selvage-upload-')).length };
};

describe('an upload', () => {
  const text = 'station,lon,lat,temp,sd,quality\nA,170.5,10,1.5,0.1,good\nB,359,20,2.5,0.2,bad\nC,west,30,3.5,0.3,good\nD,12,95,1,0.1,=1+1\n';

  it('becomes an observation set: rows read and kept, rejected rows with line, field and reason', async () => {
    const result = await api.complete(await uploaded(text, { name: 'Buoys', fileName: 'buoys.csv' }));
    expect(result).toMatchObject({ rowsRead: 4, accepted: 2, rejectedCount: 2 });
    const set = await api.get(`/observation-sets/${result.observationSetId}`);
    expect(set).toMatchObject({
      name: 'Buoys',
      fileName: 'buoys.csv',
      byteLength: text.length,
      sha256: sha256(text),
      format: 'csv',
      crs: 'lonlat-deg',
      rowsRead: 4,
      accepted: 2,
      rejectedCount: 2,
      flags: [{ name: 'bad', count: 1 }, { name: 'good', count: 1 }],
      // 170.5 east to 359 = -1: the shorter way round is over 0
      extent: { west: -1, east: 170.5, south: 10, north: 20 },
    });
    const { items } = await api.get(`/observation-sets/${set.id}/rejected`);
    expect(items.map((row: any) => [row.line, row.field, row.found])).toEqual([[4, 'lon', 'west'], [5, 'lat', '95']]);
    expect(items[1].reason).toMatch(/between -90 and 90/);
    expect((await api.get(`/studies/${studyId}/observation-sets`)).items[0].id).toBe(set.id);
  });

  it('is kept byte for byte, and offered under a name that cannot break out of its header', async () => {
    const bytes = Buffer.concat([Buffer.from('lon,lat\r\n1,2\r\n3,4\r\n'), Buffer.from([0xef, 0xbb, 0xbf])]);
    const id = await setOf(bytes, { fileName: '../..\\etc/naïve "x"; filename=evil.exe\r\nSet-Cookie: a=b.csv' });
    const original = await api.bytes(`/observation-sets/${id}/original`);
    expect(Buffer.from(original.body).equals(bytes)).toBe(true);
    expect(original.headers.get('content-length')).toBe(String(bytes.length));
    expect(original.headers.get('etag')).toBe(`"${sha256(bytes)}"`);
    expect(original.headers.get('set-cookie')).toBeNull();
    const disposition = original.headers.get('content-disposition')!;
    expect(disposition).toMatch(/^attachment; filename="[^"\\]*"; filename\*=UTF-8''[\w.%~!$&+^`|-]+$/);
    expect(disposition).not.toContain('..');
    expect(decodeURIComponent(disposition.split("UTF-8''")[1])).toContain('naïve');
  });

  it('gives its rejected rows as CSV that no spreadsheet runs', async () => {
    const id = await setOf('lon,lat,value\n1,2,3\n=HYPERLINK("http://x"),2,3\n1,"+1,5",3\n2,@x,3\n', { name: 'Bad "rows"' });
    const csv = await api.bytes(`/observation-sets/${id}/rejected?format=csv`);
    expect(csv.headers.get('content-type')).toBe('text/csv; charset=utf-8');
    expect(csv.headers.get('content-disposition')).toContain('attachment');
    const lines = new TextDecoder().decode(csv.body).split('\r\n');
    expect(lines[0]).toBe('line,field,found,reason');
    expect(lines).toHaveLength(5);
    for (const [k, start] of [[1, `3,lon,"'=HYPERLINK(""http://x"")"`], [2, `4,lat,"'+1,5"`], [3, `5,lat,'@x`]] as const) expect(lines[k].startsWith(start), lines[k]).toBe(true);
  });

  it('takes a mapping, and refuses one that is not JSON or has a wrong field', async () => {
    const id = await setOf('a;b;c\n1000;2000;5\n3000;4000;6\n', { mapping: { coordinates: 'plane', planeUnit: 'm', x: 0, y: 1, value: 2 } });
    const columns = unpackObservations((await api.bytes(`/observation-sets/${id}/columns`)).body);
    expect([columns.crs, [...columns.x], [...columns.y], [...columns.value!], [...columns.line]]).toEqual(['plane-km', [1, 3], [2, 4], [5, 6], [2, 3]]);
    const before = await traces();
    const wrong = await api.upload(studyId, 'lon,lat\n1,2\n', { mapping: { coordinates: 'sideways' } });
    expect([wrong.status, wrong.body.code, wrong.body.fields[0].path]).toEqual([422, 'VALIDATION_FAILED', 'coordinates']);
    const form = new FormData();
    form.set('mapping', '{');
    form.set('file', new Blob(['lon,lat\n1,2\n']), 'x.csv');
    const broken = await fetch(`${server.url}/api/v1/studies/${studyId}/observation-sets`, { method: 'POST', headers: api.headers, body: form });
    expect([broken.status, (await broken.json()).detail]).toEqual([422, expect.stringContaining('mapping is not valid JSON')]);
    expect(await traces()).toEqual(before);
  });

  it('reads GeoJSON points', async () => {
    const id = await setOf(sample('good/points.geojson'), { fileName: 'points.geojson' });
    expect(await api.get(`/observation-sets/${id}`)).toMatchObject({ format: 'geojson', crs: 'lonlat-deg' });
  });

  it('can be deleted with its file while no design uses it, and not after', async () => {
    const before = await traces();
    const id = await setOf('lon,lat\n1,2\n2,3\n3,1\nx,1\n');
    const design = await api.post(`/studies/${studyId}/designs`, { name: 'User', observationSetId: id });
    expect(await api.refused('DELETE', `/observation-sets/${id}`)).toMatchObject({ code: 'IN_USE', detail: expect.stringContaining('Delete its designs first') });
    await api.ask('DELETE', `/designs/${design.id}`);
    expect((await api.ask('DELETE', `/observation-sets/${id}`)).status).toBe(204);
    expect((await api.ask('GET', `/observation-sets/${id}`)).status).toBe(404);
    expect(await traces()).toEqual(before);
  });
});

describe('points of an observation set', () => {
  let id: string;
  beforeAll(async () => {
    const rows = Array.from({ length: 250 }, (_, i) => `${i % 90},${(i * 7) % 60},${i % 10 === 0 ? '' : (i * 37) % 101},${i % 3 === 0 ? 'good' : 'bad'},buoy ${i % 5}`);
    id = await setOf(['lon,lat,value,flag,station', ...rows].join('\n'));
  });

  it('are paged, and every row comes once', async () => {
    const seen: number[] = [];
    for (let cursor: string | null = '0'; cursor !== null; ) {
      const page: any = await api.get(`/observation-sets/${id}/points?limit=99&offset=${cursor}`);
      expect(page.total).toBe(250);
      seen.push(...page.items.map((point: any) => point.index));
      cursor = page.nextCursor;
    }
    expect(seen).toEqual(Array.from({ length: 250 }, (_, i) => i));
  });

  it.each(['asc', 'desc'])('are sorted by a column (%s), rows without a value last', async (order) => {
    const { items } = await api.get(`/observation-sets/${id}/points?sort=value&order=${order}&limit=250`);
    const values: (number | null)[] = items.map((point: any) => point.value);
    expect(values.slice(225)).toEqual(Array(25).fill(null));
    const given = values.slice(0, 225) as number[];
    expect(given).toEqual([...given].sort((a, b) => (order === 'asc' ? a - b : b - a)));
  });

  it('are filtered by flag and by words', async () => {
    const flagged = await api.get(`/observation-sets/${id}/points?flag=good&limit=1000`);
    expect(flagged.total).toBe(84);
    expect(flagged.items.every((point: any) => point.flag === 'good')).toBe(true);
    const found = await api.get(`/observation-sets/${id}/points?search=BUOY%203&flag=good&limit=1000`);
    expect(found.total).toBe(Array.from({ length: 250 }, (_, i) => i).filter((i) => i % 3 === 0 && i % 5 === 3).length);
  });

  it('refuse a column that is none', async () => {
    expect(await api.refused('GET', `/observation-sets/${id}/points?sort=colour`)).toMatchObject({ status: 422, code: 'VALIDATION_FAILED' });
  });
});

describe('a file that cannot be read', () => {
  it.each([
    ['empty.csv', 'FILE_EMPTY', /0 bytes.*Choose/],
    ['one-column.csv', 'COLUMN_MISSING', /Only one column/],
    ['rubbish.csv', 'FILE_NOT_TEXT', /binary data/],
    ['workbook.csv', 'FILE_NOT_TEXT', /spreadsheet.*save it as CSV/],
    ['invalid-utf-8.geojson', 'FILE_NOT_TEXT', /Line 2.*UTF-8/],
    ['cut-off.geojson', 'FILE_MALFORMED', /ends too early/],
  ])('%s: the job fails, says what is wrong and what to do, and leaves nothing behind', async (name, code, says) => {
    const before = await traces();
    const job = await api.finish(await uploaded(sample(`bad/${name}`), { fileName: name }));
    expect(job.state).toBe('failed');
    expect(job.error).toMatchObject({ code, message: expect.stringMatching(says) });
    expect(await traces()).toEqual(before);
  });

  it('rows that are all bad are refused with the first reason, none of them kept', async () => {
    const before = await traces();
    const job = await api.finish(await uploaded(`lon,lat\n${'1,95\n'.repeat(30_000)}`));
    expect(job.error).toMatchObject({ code: 'NO_ROW_ACCEPTED', message: expect.stringContaining('between -90 and 90') });
    expect(await traces()).toEqual(before);
  });

  it.each([['bad latitudes, text and NaN', 'out-of-range.csv'], ['text in number columns', 'not-numbers.csv'], ['invalid UTF-8', 'invalid-utf-8.csv']])('%s: only those rows are rejected', async (_what, name) => {
    const id = await setOf(sample(`bad/${name}`));
    const set = await api.get(`/observation-sets/${id}`);
    expect(set.rejectedCount).toBeGreaterThan(0);
    expect(set.accepted + set.rejectedCount).toBe(set.rowsRead);
    expect((await api.get(`/observation-sets/${id}/rejected`)).items).toHaveLength(set.rejectedCount);
  });
});

describe('a form that is wrong', () => {
  const post = (body: BodyInit, headers: Record<string, string> = {}) => fetch(`${server.url}/api/v1/studies/${studyId}/observation-sets`, { method: 'POST', headers: { ...api.headers, ...headers }, body });

  it.each([
    ['not a form', '{}', { 'content-type': 'application/json' }, 415, /multipart\/form-data/],
    ['cut short', '--b\r\nContent-Disposition: form-data; name="file"; filename="a.csv"\r\n\r\nlon,lat\r\n1,2', { 'content-type': 'multipart/form-data; boundary=b' }, 400, /cut short/],
    ['without a file', '--b\r\nContent-Disposition: form-data; name="name"\r\n\r\nx\r\n--b--\r\n', { 'content-type': 'multipart/form-data; boundary=b' }, 400, /has no file/],
    ['without a boundary', 'x', { 'content-type': 'multipart/form-data' }, 400, /malformed/],
  ])('%s is refused and leaves nothing', async (_what, body, headers, status, says) => {
    const before = await traces();
    const response = await post(body, headers);
    expect(response.status).toBe(status);
    expect((await response.json()).detail).toMatch(says);
    expect(await traces()).toEqual(before);
  });
});

describe('an upload that is too large', () => {
  const request = (headers: http.OutgoingHttpHeaders): http.ClientRequest => http.request(`${server.url}/api/v1/studies/${studyId}/observation-sets`, { method: 'POST', headers: { ...api.headers, 'content-type': 'multipart/form-data; boundary=b', ...headers } });
  const head = '--b\r\nContent-Disposition: form-data; name="file"; filename="a.csv"\r\n\r\nlon,lat\r\n';
  const answerTo = (sent: http.ClientRequest): Promise<{ status: number; body: any }> =>
    new Promise((resolve, reject) => {
      sent.on('response', (response) => {
        let text = '';
        response.setEncoding('utf8').on('data', (part) => (text += part)).on('end', () => resolve({ status: response.statusCode!, body: JSON.parse(text) })).on('error', reject);
      });
      sent.on('error', reject);
    });

  it('is refused by its announced length before it is sent', async ({ skip }) => {
    skip(!server.isBuilt, NEEDS_BUILD);
    const before = await traces();
    const sent = request({ 'content-length': 500 * 1024 * 1024 });
    const answer = answerTo(sent);
    sent.flushHeaders();
    const { status, body } = await answer;
    sent.destroy();
    expect(status).toBe(413);
    expect(body).toMatchObject({ code: 'BODY_TOO_LARGE', detail: expect.stringMatching(/500 MB.*at most 24 MB.*Split it/) });
    expect(await traces()).toEqual(before);
  });

  it('is refused when it turns out too large on the way, and says what to do', async ({ skip }) => {
    skip(!server.isBuilt, NEEDS_BUILD);
    const before = await traces();
    const sent = request({ 'transfer-encoding': 'chunked' });
    const answer = answerTo(sent);
    let isDone = false;
    const over: (() => void)[] = [];
    void answer.catch(() => undefined).then(() => { isDone = true; over.forEach((resume) => resume()); });
    const block = '1.2345678,9.8765432\r\n'.repeat(50_000);
    sent.write(head);
    for (let at = 0; at < 3 * LIMIT_MB * 1024 * 1024 && !isDone; at += block.length) if (!sent.write(block)) await new Promise<void>((resolve) => { sent.once('drain', resolve); over.push(resolve); });
    const { status, body } = await answer;
    sent.destroy();
    expect(status).toBe(413);
    expect(body).toMatchObject({ code: 'BODY_TOO_LARGE', detail: expect.stringMatching(/larger than the 24 MB.*Nothing was kept.*Split it/) });
    expect(await traces()).toEqual(before);
  });

  it('leaves nothing when the sender breaks off', async ({ skip }) => {
    skip(!server.isBuilt, NEEDS_BUILD);
    const before = await traces();
    const sent = request({ 'transfer-encoding': 'chunked' });
    sent.on('error', () => undefined);
    sent.write(head + '1,2\r\n'.repeat(200_000));
    await expect.poll(async () => (await traces())['temporary']).toBe(before['temporary'] + 1);
    sent.destroy();
    await expect.poll(traces, { timeout: 10_000 }).toEqual(before);
  });
});

describe('a large upload', () => {
  const rows = 200_000;
  const text = (): string => {
    const lines = ['lon,lat,value,sd,time,station'];
    for (let i = 0; i < rows; i++) lines.push(`${((i * 0.618034) % 360).toFixed(6)},${(((i * 0.7548777) % 160) - 80).toFixed(6)},${(i % 997) / 10},0.5,2026-01-01T00:00:${String(i % 60).padStart(2, '0')}Z,S${i % 500}`);
    return lines.join('\n');
  };

  it('of 200,000 rows is read in the worker with progress while the server answers', async () => {
    const job = await uploaded(text());
    const fractions = new Set<number>();
    const phases = new Set<string>();
    let slowest = 0;
    let isOver = false;
    const answering = (async () => {
      while (!isOver) {
        const since = performance.now();
        await api.get(`/studies/${studyId}`);
        slowest = Math.max(slowest, performance.now() - since);
        await new Promise((resolve) => setTimeout(resolve, 20));
      }
    })();
    const done = await api.finish(job, ({ progress }) => {
      fractions.add(progress.fraction);
      phases.add(progress.phase);
    });
    isOver = true;
    await answering;
    expect(done.state, JSON.stringify(done.error)).toBe('complete');
    expect(done.result).toMatchObject({ rowsRead: rows, accepted: rows, rejectedCount: 0 });
    expect([...fractions].some((fraction) => fraction > 0 && fraction < 1)).toBe(true);
    expect([...phases].some((phase) => /reading: [\d,]+ rows/.test(phase)), [...phases].join('; ')).toBe(true);
    console.log(`slowest answer while 200,000 rows were read: ${slowest.toFixed(0)} ms`);
    const page = await api.get(`/observation-sets/${done.result!['observationSetId']}/points?sort=value&order=desc&limit=3`);
    expect(page.items.map((point: any) => point.value)).toEqual([99.6, 99.6, 99.6]);
    const columns = unpackObservations((await api.bytes(`/observation-sets/${done.result!['observationSetId']}/columns`)).body);
    expect(columns.x).toHaveLength(rows);
  });

  it('can be cancelled while it is read, and leaves nothing', async () => {
    const before = await traces();
    const job = await uploaded(text());
    let isAsked = false;
    const done = await api.finish(job, ({ state }) => {
      if (state === 'running' && !isAsked) {
        isAsked = true;
        void api.ask('POST', `/jobs/${job.id}/cancel`);
      }
    });
    expect(done.state).toBe('cancelled');
    expect(await traces()).toEqual(before);
    expect(await api.refused('POST', `/jobs/${job.id}/cancel`)).toMatchObject({ code: 'JOB_FINISHED' });
  });

  it('of a million bad rows keeps every reason', async () => {
    const bad = 1_000_000;
    const id = await setOf(`lon,lat\n1,2\n${'1,95\n'.repeat(bad)}`);
    expect(await api.get(`/observation-sets/${id}`)).toMatchObject({ accepted: 1, rejectedCount: bad });
    const last = await api.get(`/observation-sets/${id}/rejected?cursor=${bad - 1}`);
    expect(last).toMatchObject({ items: [{ line: bad + 2, field: 'lat', found: '95' }], nextCursor: null });
    expect((await api.ask('DELETE', `/observation-sets/${id}`)).status).toBe(204);
  }, 180_000);
});

describe('an upload that waits for a worker', () => {
  it('can be cancelled, and leaves nothing', async () => {
    const quiet = await createTestDatabase();
    const alone = await startTestServer({ databaseUrl: quiet.url });
    try {
      const { teamId, emails } = await createTeam(quiet);
      const person = await signIn(alone.url, emails.designer);
      const study = await person.post(`/teams/${teamId}/studies`, { name: 'Waiting', correlation: { kind: 'scalar', daleyKm: 100, steps: 4 } });
      const [first, second] = [await person.upload(study.id, 'lon,lat\n1,2\n'), await person.upload(study.id, 'lon,lat\n3,4\n')];
      expect(await person.get(`/jobs/${first.body.id}`)).toMatchObject({ state: 'queued' });
      expect(await person.post(`/jobs/${first.body.id}/cancel`)).toMatchObject({ state: 'cancelled' });
      // the file of the other one is still wanted
      expect(await quiet.query('SELECT sha256 FROM stored_files')).toEqual([{ sha256: sha256('lon,lat\n3,4\n') }]);
      expect(await person.get(`/jobs/${second.body.id}`)).toMatchObject({ state: 'queued' });
    } finally {
      await alone.stop();
      await quiet.drop();
    }
  });
});
