import { describe, expect, it } from 'vitest';

import { EnvError, readEnv } from '#server/env.ts';

const GOOD = { DATABASE_URL: 'postgres://a:b@127.0.0.1:5432/selvage', SELVAGE_SESSION_SECRET: 'x'.repeat(32) };

describe('readEnv', () => {
  it('fills in defaults that listen on the loopback interface and trust no proxy', () => {
    expect(readEnv(GOOD)).toMatchObject({ host: '127.0.0.1', port: 4280, trustProxy: false, logLevel: 'info', uploadLimitBytes: 256 * 1024 * 1024 });
  });

  it('reads numbers, flags and sizes, and takes an empty setting as absent', () => {
    const env = readEnv({ ...GOOD, PORT: '8080', SELVAGE_TRUST_PROXY: '1', SELVAGE_UPLOAD_LIMIT_MB: '2', HOST: '', SELVAGE_BASE_URL: 'https://mesh.example.org/' });
    expect(env).toMatchObject({ port: 8080, trustProxy: true, uploadLimitBytes: 2 * 1024 * 1024, host: '127.0.0.1', baseUrl: 'https://mesh.example.org' });
  });

  it.each([
    ['DATABASE_URL', undefined, 'DATABASE_URL is not set'],
    ['DATABASE_URL', 'mysql://a@b/c', 'DATABASE_URL is wrong'],
    ['SELVAGE_SESSION_SECRET', 'short', 'SELVAGE_SESSION_SECRET is wrong'],
    ['PORT', 'http', 'PORT is wrong'],
    ['PORT', '70000', 'PORT is wrong'],
    ['SELVAGE_TRUST_PROXY', 'perhaps', 'SELVAGE_TRUST_PROXY is wrong'],
    ['SELVAGE_LOG_LEVEL', 'loud', 'SELVAGE_LOG_LEVEL is wrong'],
    ['SELVAGE_DEMO_PASSWORD', 'short', 'SELVAGE_DEMO_PASSWORD is wrong'],
  ])('names %s when it is %s, in one line', (name, value, start) => {
    const read = () => readEnv({ ...GOOD, [name]: value });
    expect(read).toThrow(EnvError);
    expect(read).toThrow(new RegExp(`^${start}: [^\n]+\\.$`));
  });

  it('never repeats the value of a secret', () => {
    expect(() => readEnv({ ...GOOD, SELVAGE_SESSION_SECRET: 'hunter2' })).toThrow(/^(?!.*hunter2)/);
  });
});
