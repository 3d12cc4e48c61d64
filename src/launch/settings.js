// Folders, kept secrets and ports of one installation.
import { randomBytes } from 'node:crypto';
import fs from 'node:fs';
import net from 'node:net';
import path from 'node:path';
import { fileURLToPath } from 'node:url';

import { isAlive, readCommand, StartError } from '../../db/private-postgres.js';

/** The checkout. */
export const ROOT = fileURLToPath(new URL('../..', import.meta.url)).replace(/\/$/, '');

export const DEFAULT_PORT = 4280;

export const DEMO_ACCOUNTS = ['viewer', 'designer', 'reviewer', 'admin'].map((name) => `${name}@selvage.example`);

/** Where an installation keeps its database, secrets and logs: SELVAGE_DATA_DIR, or `.selvage` in the checkout. */
export function dataFolder() {
  const folder = path.resolve(ROOT, process.env.SELVAGE_DATA_DIR || '.selvage');
  try {
    fs.mkdirSync(folder, { recursive: true });
    fs.accessSync(folder, fs.constants.W_OK);
  } catch (cause) {
    throw new StartError(`The data folder ${folder} cannot be written by this account. Set SELVAGE_DATA_DIR to a folder of your own.`, { cause });
  }
  return folder;
}

/**
 * The secrets of this installation, made at the first start and readable by this account alone.
 * @returns {{ sessionSecret: string, demoPassword: string }}
 */
export function keepSecrets(folder) {
  const file = path.join(folder, 'secrets.json');
  let kept = {};
  try {
    kept = JSON.parse(fs.readFileSync(file, 'utf8'));
  } catch (error) {
    if (error.code !== 'ENOENT') throw new StartError(`The secrets in ${file} cannot be read: ${error.message}. Start as the account that owns the file, or set SELVAGE_DATA_DIR to another folder.`);
  }
  const secrets = {
    sessionSecret: process.env.SELVAGE_SESSION_SECRET || kept.sessionSecret || randomBytes(32).toString('hex'),
    demoPassword: kept.demoPassword || process.env.SELVAGE_DEMO_PASSWORD || readablePassword(),
  };
  if (secrets.demoPassword !== kept.demoPassword || (!process.env.SELVAGE_SESSION_SECRET && secrets.sessionSecret !== kept.sessionSecret)) {
    const text = { sessionSecret: kept.sessionSecret ?? secrets.sessionSecret, demoPassword: secrets.demoPassword };
    fs.writeFileSync(`${file}.new`, `${JSON.stringify(text, null, 2)}\n`, { mode: 0o600 });
    fs.renameSync(`${file}.new`, file);
  }
  return secrets;
}

/** Four groups of four letters and digits that are not mistaken for one another: 80 bits. */
function readablePassword() {
  const letters = 'abcdefghijkmnpqrstuvwxyz23456789';
  const text = [...randomBytes(16)].map((byte) => letters[byte % 32]).join('');
  return text.replace(/(.{4})(?=.)/g, '$1-');
}

/** The wanted port, or the next free one above it. @returns {Promise<{ port: number, wanted: number }>} */
export async function choosePort() {
  const text = process.env.PORT || String(DEFAULT_PORT);
  const wanted = Number(text);
  if (!Number.isInteger(wanted) || wanted < 1 || wanted > 65535) throw new StartError(`PORT is "${text}": give a whole number from 1 to 65535.`);
  const host = process.env.HOST || '127.0.0.1';
  for (let port = wanted; port <= Math.min(wanted + 99, 65535); port += 1) {
    const problem = await tryPort(host, port);
    if (problem === undefined) return { port, wanted };
    if (problem === 'EACCES') throw new StartError(`Port ${port} may not be used by this account. Set PORT to a number above 1023.`);
    if (problem !== 'EADDRINUSE') throw new StartError(`The server cannot listen on ${host} (${problem}). Set HOST to an address of this machine.`);
  }
  throw new StartError(`No port from ${wanted} to ${wanted + 99} is free. Set PORT to a free one.`);
}

function tryPort(host, port) {
  return new Promise((resolve) => {
    const probe = net.createServer();
    probe.once('error', (error) => resolve(error.code));
    probe.listen({ host, port, exclusive: true }, () => probe.close(() => resolve(undefined)));
  });
}

/**
 * Makes this process the only one that runs on a data folder.
 * @returns {{ note(url: string): void, release(): void }}
 * @throws {StartError} with the other's address when one already runs
 */
export function lockFolder(folder) {
  const file = path.join(folder, 'running.json');
  const write = (flag, url) => fs.writeFileSync(file, `${JSON.stringify({ pid: process.pid, url })}\n`, { flag, mode: 0o600 });
  for (;;) {
    try {
      write('wx');
      break;
    } catch (error) {
      if (error.code !== 'EEXIST') throw new StartError(`The data folder ${folder} cannot be used: ${error.message}`);
    }
    const other = readRunning(file);
    if (other !== undefined && other.pid !== process.pid && isAlive(other.pid) && /launch\/(start|dev)\.js/.test(readCommand(other.pid)))
      throw new StartError(
        `Selvage already runs on the data in ${folder}${other.url === undefined ? '' : `, at ${other.url}`} (process ${other.pid}). ` +
          'Use that one, end it with Ctrl-C, or set SELVAGE_DATA_DIR to run a second one.',
      );
    fs.rmSync(file, { force: true });
  }
  return {
    note: (url) => write('w', url),
    release: () => fs.rmSync(file, { force: true }),
  };
}

function readRunning(file) {
  try {
    return JSON.parse(fs.readFileSync(file, 'utf8'));
  } catch {
    return undefined;
  }
}
