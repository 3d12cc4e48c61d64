import { hash } from '@node-rs/argon2';
import { expect } from 'vitest';

import type { Job } from '#schemas/jobs.ts';
import { ROLES, type Role } from '#schemas/people.ts';
import { type Problem, problemSchema } from '#schemas/problem.ts';
import { ROUTES } from '#server/openapi/routes.ts';

import type { TestDatabase } from './test-database.ts';

const PASSWORD = 'warp, weft and selvage';

/** A team with one person in each role. */
export interface TestTeam {
  teamId: string;
  emails: Record<Role, string>;
}

let count = 0;

/** Writes a team with one person in each role into a database. */
export const createTeam = async (database: TestDatabase): Promise<TestTeam> => {
  // cheap on purpose: the parameters are part of the hash
  const passwordHash = await hash(PASSWORD, { memoryCost: 8, timeCost: 1, parallelism: 1 });
  const number = ++count;
  const [{ id: teamId }] = await database.query<{ id: string }>('INSERT INTO teams (name) VALUES ($1) RETURNING id', [`Team ${number}`]);
  const emails = {} as Record<Role, string>;
  for (const role of ROLES) {
    emails[role] = `${role}-${number}@selvage.example`;
    await database.query('WITH u AS (INSERT INTO users (email, name, password_hash) VALUES ($1, $2, $3) RETURNING id) INSERT INTO memberships (team_id, user_id, role) SELECT $4, id, $5 FROM u', [emails[role], `${role} ${number}`, passwordHash, teamId, role]);
  }
  return { teamId, emails };
};

export interface Answer<T> {
  status: number;
  headers: Headers;
  body: T;
}

export interface UploadOptions {
  name?: string;
  fileName?: string;
  mapping?: unknown;
}

/** A person at the interface. Every JSON answer is held to the shape that the OpenAPI document promises. */
export interface Api {
  /** Answer of any status with its JSON body. */
  ask<T = any>(method: string, path: string, body?: unknown): Promise<Answer<T>>;
  /** JSON body of a request that has to succeed. */
  get<T = any>(path: string): Promise<T>;
  post<T = any>(path: string, body?: unknown): Promise<T>;
  patch<T = any>(path: string, body: unknown): Promise<T>;
  /** Problem details of a request that has to fail. */
  refused(method: string, path: string, body?: unknown): Promise<Problem>;
  bytes(path: string): Promise<Answer<Uint8Array<ArrayBuffer>>>;
  upload(studyId: string, content: Uint8Array | string, options?: UploadOptions): Promise<Answer<any>>;
  /** The job when it has ended; `onState` sees every state on the way. */
  finish(job: Job, onState?: (job: Job) => void): Promise<Job>;
  /** The result of a job that has to complete. */
  complete<T = any>(job: Job): Promise<T>;
  headers: Record<string, string>;
}

/** Signs in and returns the person's view of the interface. */
export const signIn = async (url: string, email: string): Promise<Api> => {
  const session = await fetch(`${url}/api/v1/session`, { method: 'POST', headers: { 'content-type': 'application/json' }, body: JSON.stringify({ email, password: PASSWORD }) });
  expect(session.status, await session.text()).toBe(204);
  return createApi(url, session.headers.getSetCookie()[0].split(';')[0]);
};

/** The interface as seen with a cookie, or signed out. */
export const createApi = (url: string, cookie?: string): Api => {
  const headers: Record<string, string> = cookie === undefined ? {} : { cookie };
  const send = async (method: string, path: string, body?: BodyInit, more: Record<string, string> = {}): Promise<Answer<any>> => {
    const response = await fetch(`${url}/api/v1${path}`, { method, headers: { ...headers, ...more }, body });
    const text = await response.text();
    const answer = { status: response.status, headers: response.headers, body: text === '' ? undefined : JSON.parse(text) };
    holdToContract(method, path, answer);
    return answer;
  };
  const ask: Api['ask'] = (method, path, body) => send(method, path, body === undefined ? undefined : JSON.stringify(body), body === undefined ? {} : { 'content-type': 'application/json' });
  const succeed = async (method: string, path: string, body?: unknown): Promise<any> => {
    const answer = await ask(method, path, body);
    expect(answer.status, JSON.stringify(answer.body)).toBeLessThan(300);
    return answer.body;
  };
  const finish: Api['finish'] = async (job, onState) => {
    for (const end = Date.now() + 120_000; Date.now() < end; ) {
      const now = await succeed('GET', `/jobs/${job.id}`);
      onState?.(now);
      if (['complete', 'failed', 'cancelled'].includes(now.state)) return now;
      await new Promise((resolve) => setTimeout(resolve, 40));
    }
    throw new Error(`The job ${job.kind} did not end.`);
  };
  return {
    headers,
    ask,
    finish,
    get: (path) => succeed('GET', path),
    post: (path, body) => succeed('POST', path, body),
    patch: (path, body) => succeed('PATCH', path, body),
    async refused(method, path, body) {
      const answer = await ask(method, path, body);
      expect(answer.status, JSON.stringify(answer.body)).toBeGreaterThanOrEqual(400);
      return answer.body as Problem;
    },
    async bytes(path) {
      const response = await fetch(`${url}/api/v1${path}`, { headers });
      return { status: response.status, headers: response.headers, body: new Uint8Array(await response.arrayBuffer()) };
    },
    upload(studyId, content, { name, fileName = 'observations.csv', mapping } = {}) {
      const form = new FormData();
      if (name !== undefined) form.set('name', name);
      if (mapping !== undefined) form.set('mapping', JSON.stringify(mapping));
      form.set('file', new Blob([content as BlobPart]), fileName);
      return send('POST', `/studies/${studyId}/observation-sets`, form);
    },
    async complete(job) {
      const done = await finish(job);
      expect(done.state, JSON.stringify(done.error)).toBe('complete');
      return done.result as any;
    },
  };
};

const holdToContract = (method: string, path: string, { status, headers, body }: Answer<unknown>): void => {
  const address = path.split('?')[0];
  const pattern = (route: string): RegExp => new RegExp(`^${route.replaceAll('.', '\\.').replaceAll(/\{\w+\}/g, '[^/]+')}$`);
  const route = ROUTES.find((one) => one.method === method && pattern(one.path).test(address));
  const where = `${method} ${path} answered ${status}`;
  if (status >= 400) {
    expect(headers.get('content-type'), where).toBe('application/problem+json');
    expect(problemSchema.parse(body), where).toEqual(body);
    expect((body as Problem).status, where).toBe(status);
    return;
  }
  expect(route, `${where}, which no route describes`).toBeDefined();
  expect(status, where).toBe(route!.status);
  // parsing drops what the schema does not name: nothing may be lost
  if (route!.answer) expect(route!.answer.parse(body), where).toEqual(body);
  else expect(body, where).toBeUndefined();
};
