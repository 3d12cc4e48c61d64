import { type ChildProcess, spawn } from 'node:child_process';
import { existsSync } from 'node:fs';
import path from 'node:path';

import { findSetpriv, freePort } from '../../db/private-postgres.js';
import { freshBuild } from '../../src/launch/build.js';

const ROOT = path.resolve(import.meta.dirname, '../..');

export interface TestServerOptions {
  databaseUrl: string;
  /** Further settings of the processes. */
  env?: Record<string, string>;
  /** Also start a worker. */
  worker?: boolean;
}

export interface TestServer {
  /** http://127.0.0.1:port, without a slash at the end. */
  url: string;
  /** Whether it is the build, with the product's own HTTP server in front, and not Astro's development server. */
  isBuilt: boolean;
  /** What the processes wrote so far. */
  output(): string;
  /** Ends what was started; rejects when a process had already ended by itself. */
  stop(): Promise<void>;
}

/**
 * The web server (and a worker) on a database. Takes the build of the present sources when there is one, as in
 * `npm test`; otherwise Astro's development server and the worker's sources, so that a single test needs no build.
 */
export async function startTestServer(options: TestServerOptions): Promise<TestServer> {
  const build = process.env['SELVAGE_TEST_BUILD'] ?? freshBuild();
  const port = await freePort();
  const env = {
    ...process.env,
    DATABASE_URL: options.databaseUrl,
    HOST: '127.0.0.1',
    PORT: String(port),
    SELVAGE_SESSION_SECRET: 'a test secret that is longer than 32 characters',
    SELVAGE_LOG_LEVEL: 'warn',
    ASTRO_TELEMETRY_DISABLED: '1',
    ASTRO_DISABLE_UPDATE_CHECK: 'true',
    NODE_ENV: build === undefined ? 'development' : 'production',
    VITEST: undefined,
    ...options.env,
  };
  const web = build === undefined ? ['node_modules/astro/astro.js', 'dev', '--port', String(port), '--host', '127.0.0.1'] : [path.join(build, 'web.js')];
  const worker = build === undefined ? ['--import', 'tsx', 'src/worker/main.ts'] : [path.join(build, 'worker/main.js')];
  const processes = [startNode('web server', web, env)];
  if (options.worker === true) {
    if (!existsSync(path.resolve(ROOT, worker.at(-1) ?? ''))) throw new Error('There is no worker to start.');
    processes.push(startNode('worker', worker, env));
  }
  const output = () => processes.map((one) => `--- ${one.name}\n${one.output()}`).join('\n');
  const url = `http://127.0.0.1:${port}`;
  for (const end = Date.now() + 60_000; ; ) {
    const ended = processes.find((one) => one.hasEnded());
    if (ended !== undefined || Date.now() > end) {
      await Promise.all(processes.map((one) => one.stop()));
      throw new Error(`The ${ended?.name ?? 'web server'} ${ended === undefined ? 'was not ready after a minute' : 'ended while starting'}:\n${output()}`);
    }
    const isReady = await fetch(`${url}/readyz`).then((answer) => answer.ok, () => false);
    if (isReady) break;
    await new Promise((resolve) => setTimeout(resolve, 50));
  }
  return {
    url,
    isBuilt: build !== undefined,
    output,
    async stop() {
      const crashed = processes.filter((one) => one.hasEnded());
      await Promise.all(processes.map((one) => one.stop()));
      if (crashed.length > 0) throw new Error(`The ${crashed.map((one) => one.name).join(' and ')} ended during the test:\n${output()}`);
    },
  };
}

interface StartedProcess {
  name: string;
  output(): string;
  hasEnded(): boolean;
  stop(): Promise<void>;
}

function startNode(name: string, args: string[], env: Record<string, string | undefined>): StartedProcess {
  const command = [process.execPath, ...args];
  const guard = findSetpriv();
  const [program = process.execPath, ...rest] = guard === undefined ? command : [guard, '--pdeathsig', 'KILL', ...command];
  const child: ChildProcess = spawn(program, rest, { cwd: ROOT, env: env as NodeJS.ProcessEnv, stdio: ['ignore', 'pipe', 'pipe'] });
  let text = '';
  for (const stream of [child.stdout, child.stderr]) stream?.on('data', (chunk: Buffer) => (text += chunk.toString()));
  const exited = new Promise<void>((resolve) => child.once('exit', () => resolve()));
  const hasEnded = () => child.exitCode !== null || child.signalCode !== null;
  return {
    name,
    output: () => text,
    hasEnded,
    async stop() {
      if (hasEnded()) return;
      child.kill('SIGTERM');
      const timer = setTimeout(() => child.kill('SIGKILL'), 15_000);
      await exited;
      clearTimeout(timer);
    },
  };
}
