// Starts, watches and ends the processes of one run.
import { spawn } from 'node:child_process';
import readline from 'node:readline';

import { findSetpriv } from '../../db/private-postgres.js';
import { ROOT } from './settings.js';

/**
 * Child processes that are ended in a stated order. Each gets a process group of its own, so that Ctrl-C reaches the
 * launcher alone, and a signal from the kernel when the launcher is killed.
 */
export class Processes {
  #children = [];
  #stopping = undefined;
  #cleanups = [];
  #onEnd;

  /** @param {(name: string, how: string) => void} onEnd called when a child ends before it was told to */
  constructor(onEnd) {
    this.#onEnd = onEnd;
  }

  get stopping() {
    return this.#stopping !== undefined;
  }

  /**
   * @param {string} name
   * @param {string[]} args arguments of Node
   * @param {{ env?: Record<string, string | undefined>, patience?: number, onLine?: (line: string) => void }} [options]
   *   patience: milliseconds between SIGTERM and SIGKILL
   */
  node(name, args, { env = {}, patience = 15_000, onLine } = {}) {
    const guard = findSetpriv();
    const command = [process.execPath, ...args];
    const [program, ...rest] = guard === undefined ? command : [guard, '--pdeathsig', 'TERM', ...command];
    const child = spawn(program, rest, {
      cwd: ROOT,
      env: { ...process.env, ...env, SELVAGE_PROCESS: name },
      stdio: ['ignore', onLine === undefined ? 'inherit' : 'pipe', onLine === undefined ? 'inherit' : 'pipe'],
      detached: true,
    });
    if (onLine !== undefined) for (const stream of [child.stdout, child.stderr]) readline.createInterface({ input: stream }).on('line', onLine);
    const exited = new Promise((resolve) => {
      child.once('error', (error) => resolve(error.message));
      child.once('exit', (code, signal) => resolve(signal === null ? `exit code ${code}` : `signal ${signal}`));
    });
    this.#children.push({ name, child, exited, patience });
    void exited.then((how) => {
      if (!this.stopping) this.#onEnd(name, how);
    });
    return { child, exited };
  }

  /** Runs `stop` after all children, the newest registration first. */
  afterwards(stop) {
    this.#cleanups.push(stop);
  }

  /** Ends the children one after the other, oldest first, then what `afterwards` registered. */
  stop() {
    this.#stopping ??= (async () => {
      for (const one of this.#children) await end(one);
      for (const cleanup of this.#cleanups.reverse()) await cleanup();
    })();
    return this.#stopping;
  }

  /** Kills what still lives, for a person who does not want to wait. */
  kill() {
    for (const { child } of this.#children) signalGroup(child, 'SIGKILL');
  }
}

async function end({ child, exited, patience }) {
  if (child.exitCode === null && child.signalCode === null) child.kill('SIGTERM');
  const timer = setTimeout(() => signalGroup(child, 'SIGKILL'), patience);
  await exited;
  clearTimeout(timer);
  // Whatever the child started itself shares its group.
  signalGroup(child, 'SIGKILL');
}

function signalGroup(child, signal) {
  try {
    if (child.pid !== undefined) process.kill(-child.pid, signal);
  } catch {
    // Nobody is left in the group.
  }
}

/**
 * Calls `stop` once for Ctrl-C, SIGTERM, a closed terminal, or the death of the npm that started us; `hurry` for a second Ctrl-C
 * after two seconds (npm passes the first one on, so one key press can arrive twice).
 */
export function onStopSignal(stop, hurry) {
  let first;
  for (const signal of ['SIGINT', 'SIGTERM', 'SIGHUP']) {
    process.on(signal, () => {
      if (first === undefined) {
        first = Date.now();
        stop(signal);
      } else if (Date.now() - first > 2_000) hurry();
    });
  }
  if (process.env.npm_lifecycle_event === undefined) return;
  const npm = process.ppid;
  const watch = setInterval(() => {
    if (process.ppid === npm || first !== undefined) return;
    first = Date.now();
    clearInterval(watch);
    stop('the end of npm');
  }, 1_000);
  watch.unref();
}

/** Waits until `url` answers 200. @returns {Promise<boolean>} false when `isOver()` became true or the time ran out */
export async function waitFor(url, { isOver, seconds = 60 }) {
  for (const end = Date.now() + seconds * 1000; Date.now() < end && !isOver(); ) {
    try {
      const answer = await fetch(url, { signal: AbortSignal.timeout(5_000) });
      await answer.arrayBuffer();
      if (answer.ok) return true;
    } catch {
      // Not listening yet.
    }
    await new Promise((resolve) => setTimeout(resolve, 60));
  }
  return false;
}
