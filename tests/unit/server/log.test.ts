import { spawn } from 'node:child_process';
import path from 'node:path';

import { expect, it } from 'vitest';

import { createRecordingLog } from '#support/recording-log.ts';

it('replaces secrets wherever a request or a body would put them', () => {
  const { log, entries } = createRecordingLog();
  log.info({ password: 'hunter2', body: { newPassword: 'hunter2', name: 'kept' }, req: { headers: { authorization: 'hunter2', cookie: 'hunter2' } } }, 'Signed in');
  expect(JSON.stringify(entries)).not.toContain('hunter2');
  expect(entries[0]).toMatchObject({ msg: 'Signed in', level: 'info', body: { name: 'kept' } });
});

it('lets a process end whose reader is gone', async () => {
  const root = path.resolve(import.meta.dirname, '../../..');
  const program = `import { getLog } from '#server/log.ts';
    const log = getLog();
    process.on('SIGTERM', () => { log.info('Stopping'); log.info('Stopped'); process.exit(0); });
    setInterval(() => {}, 1000);
    log.info('Ready');`;
  const child = spawn(process.execPath, ['--import', 'tsx', '--input-type=module', '-e', program], { cwd: root, stdio: ['ignore', 'pipe', 'pipe'] });
  const exited = new Promise<number | null>((resolve) => child.once('exit', (code) => resolve(code)));
  try {
    expect(JSON.parse(await new Promise<string>((resolve) => child.stdout.once('data', (chunk: Buffer) => resolve(chunk.toString()))))).toMatchObject({ msg: 'Ready' });
    child.stdout.destroy();
    child.stderr.destroy();
    child.kill('SIGTERM');
    expect(await Promise.race([exited, new Promise((resolve) => setTimeout(() => resolve('it hangs'), 10_000))])).toBe(0);
  } finally {
    child.kill('SIGKILL');
  }
});
