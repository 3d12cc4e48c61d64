import { expect, it } from 'vitest';

import { createRecordingLog } from '#support/recording-log.ts';

it('replaces secrets wherever a request or a body would put them', () => {
  const { log, entries } = createRecordingLog();
  log.info({ password: 'hunter2', body: { newPassword: 'hunter2', name: 'kept' }, req: { headers: { authorization: 'hunter2', cookie: 'hunter2' } } }, 'Signed in');
  expect(JSON.stringify(entries)).not.toContain('hunter2');
  expect(entries[0]).toMatchObject({ msg: 'Signed in', level: 'info', body: { name: 'kept' } });
});
