import { type ChildProcess, spawn, type SpawnOptions } from 'node:child_process';
import fs from 'node:fs';
import os from 'node:os';
import path from 'node:path';

import { findSetpriv, isAlive, readCommand } from '../../db/private-postgres.js';

export const ROOT = path.resolve(import.meta.dirname, '../..');

export interface Launched {
  child: ChildProcess;
  /** What it wrote so far. */
  output(): string;
  /** Resolves with the address when it says that it is ready; rejects with its output when it ends before. */
  ready(): Promise<string>;
  /** Resolves with the exit code (null after a signal). */
  exited: Promise<number | null>;
  /** Process numbers of all that it started, directly or not. */
  descendants(): number[];
}

/** Runs `npm start`'s program. The test ends it; DATABASE_URL and the data folder come from `env` alone. */
export function launch(env: Record<string, string>, options: SpawnOptions = {}): Launched {
  // Should the test run be killed, the launcher is told to stop.
  const guard = findSetpriv();
  const command = [process.execPath, 'src/launch/start.js'];
  const [program = process.execPath, ...rest] = guard === undefined ? command : [guard, '--pdeathsig', 'TERM', ...command];
  const child = spawn(program, rest, {
    cwd: ROOT,
    stdio: ['ignore', 'pipe', 'pipe'],
    ...options,
    env: { ...process.env, DATABASE_URL: undefined, SELVAGE_DEMO_PASSWORD: undefined, SELVAGE_THROWAWAY: '1', VITEST: undefined, npm_lifecycle_event: undefined, ...env } as NodeJS.ProcessEnv,
  });
  let text = '';
  for (const stream of [child.stdout, child.stderr]) stream?.on('data', (chunk: Buffer) => (text += chunk.toString()));
  const exited = new Promise<number | null>((resolve) => child.once('close', (code) => resolve(code)));
  return {
    child,
    output: () => text,
    exited,
    async ready() {
      for (const end = Date.now() + 240_000; Date.now() < end; ) {
        const address = /Selvage is ready: (http:\S+)/.exec(text)?.[1];
        if (address !== undefined) return address;
        if (child.exitCode !== null || child.signalCode !== null) break;
        await new Promise((resolve) => setTimeout(resolve, 50));
      }
      throw new Error(`It did not become ready:\n${text}`);
    },
    descendants: () => descendantsOf(child.pid ?? 0),
  };
}

/** A folder for one installation that a database server under another account can reach; remove it with the returned function. */
export function makeDataFolder(owner?: { uid: number; gid: number }): { folder: string; remove(): void } {
  const folder = fs.mkdtempSync(path.join(os.tmpdir(), 'selvage-launch-'));
  fs.chmodSync(folder, 0o711);
  if (owner !== undefined) fs.chownSync(folder, owner.uid, owner.gid);
  return { folder, remove: () => fs.rmSync(folder, { recursive: true, force: true }) };
}

/** Those of `pids` that live, with their commands. */
export const livingOf = (pids: number[]): string[] => pids.filter(isAlive).map((pid) => `${pid} ${readCommand(pid)}`);

function descendantsOf(root: number): number[] {
  const children = new Map<number, number[]>();
  for (const name of fs.readdirSync('/proc')) {
    if (!/^\d+$/.test(name)) continue;
    try {
      const stat = fs.readFileSync(`/proc/${name}/stat`, 'utf8');
      const parent = Number(stat.slice(stat.lastIndexOf(')') + 2).split(' ')[1]);
      children.set(parent, [...(children.get(parent) ?? []), Number(name)]);
    } catch {
      // It ended while we looked.
    }
  }
  const found: number[] = [];
  for (let next = children.get(root) ?? []; next.length > 0; next = next.flatMap((pid) => children.get(pid) ?? [])) found.push(...next);
  return found;
}
