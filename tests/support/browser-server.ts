import { spawn } from 'node:child_process';
import fs from 'node:fs';
import os from 'node:os';
import path from 'node:path';

import { findSetpriv, freePort } from '../../db/private-postgres.js';

const ROOT = path.resolve(import.meta.dirname, '../..');

/** Password of the demo accounts in browser tests. */
export const DEMO_PASSWORD = 'linen-warp-and-weft';

/** Starts Selvage as `npm start` does, on a throw-away data folder; its address is SELVAGE_TEST_URL. */
export default async function setup(): Promise<() => Promise<void>> {
  if (process.env['SELVAGE_TEST_URL'] !== undefined) return async () => {};
  const folder = fs.mkdtempSync(path.join(os.tmpdir(), 'selvage-browser-'));
  fs.chmodSync(folder, 0o711);
  const port = await freePort();
  const guard = findSetpriv();
  const command = [process.execPath, 'src/launch/start.js'];
  const [program = process.execPath, ...rest] = guard === undefined ? command : [guard, '--pdeathsig', 'TERM', ...command];
  const child = spawn(program, rest, {
    cwd: ROOT,
    env: {
      ...process.env,
      PORT: String(port),
      SELVAGE_DATA_DIR: folder,
      SELVAGE_THROWAWAY: '1',
      SELVAGE_DEMO_PASSWORD: DEMO_PASSWORD,
      SELVAGE_LOG_LEVEL: 'warn',
    },
    stdio: ['ignore', 'pipe', 'pipe'],
  });
  let text = '';
  for (const stream of [child.stdout, child.stderr]) stream.on('data', (chunk: Buffer) => (text += chunk.toString()));
  const exited = new Promise<void>((resolve) => child.once('exit', () => resolve()));
  const stop = async () => {
    child.kill('SIGTERM');
    await exited;
    fs.rmSync(folder, { recursive: true, force: true });
  };
  for (const end = Date.now() + 240_000; ; ) {
    const address = /Selvage is ready: (http:\S+)/.exec(text);
    if (address?.[1] !== undefined) {
      process.env['SELVAGE_TEST_URL'] = address[1];
      return stop;
    }
    if (child.exitCode !== null || Date.now() > end) {
      await stop();
      throw new Error(`Selvage did not start for the browser tests:\n${text}`);
    }
    await new Promise((resolve) => setTimeout(resolve, 100));
  }
}
