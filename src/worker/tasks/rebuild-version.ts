import { spawn } from 'node:child_process';
import { fileURLToPath } from 'node:url';

import { MeshVersion } from '#db/models/MeshVersion.ts';
import { ObservationSetRow } from '#db/models/ObservationSetRow.ts';
import { StoredFile } from '#db/models/StoredFile.ts';
import { AppError } from '#server/errors.ts';
import { readStoredFile } from '#server/observations/store-upload.ts';

import type { Task } from '../task.ts';

/** The program run in a process of its own: see `rebuild.thread.ts`. */
const program = (): string => fileURLToPath(new URL(import.meta.url.endsWith('.ts') ? '../rebuild.thread.ts' : './rebuild.thread.js', import.meta.url));

/**
 * Makes a version again from the original bytes and its recipe, in a fresh process that is given nothing else and no
 * access to the database, and compares the hashes.
 */
export const rebuildVersionTask: Task = async (payload, { signal, reportProgress }) => {
  const { versionId } = payload as { versionId: string };
  const version = await MeshVersion.findByPk(versionId, { attributes: ['id', 'observationSetId', 'recipe', 'correlation', 'meshHash', 'observationSha256'] });
  const set = version && (await ObservationSetRow.findByPk(version.observationSetId, { attributes: ['id', 'fileId', 'mapping', 'format'] }));
  const file = set && (await StoredFile.findByPk(set.fileId));
  if (!version || !set || !file) throw new AppError('NOT_FOUND', 'The version or its original file is gone.');
  reportProgress(0.1, 'rebuilding in a process of its own');
  const request = { mapping: set.mapping, recipe: version.recipe, sphereRadiusKm: version.correlation.sphereRadiusKm };
  const answer = await runRebuild(request, readStoredFile(file.id), signal);
  return { expectedHash: version.meshHash, rebuiltHash: answer.meshHash, reproduced: answer.meshHash === version.meshHash, observationSha256: answer.observationSha256 };
};

const runRebuild = async (request: unknown, file: AsyncIterable<Buffer>, signal: AbortSignal): Promise<{ meshHash: string; observationSha256: string }> => {
  const child = spawn(process.execPath, [...process.execArgv, program()], { env: { NODE_ENV: process.env['NODE_ENV'] ?? 'production' }, stdio: ['pipe', 'pipe', 'pipe'], signal });
  let output = '';
  let complaint = '';
  child.stdout.on('data', (part: Buffer) => (output += part.toString()));
  child.stderr.on('data', (part: Buffer) => (complaint += part.toString()));
  child.stdin.on('error', () => undefined);
  const ended = new Promise<number | null>((resolve, reject) => {
    child.on('error', reject);
    child.on('close', resolve);
  });
  ended.catch(() => undefined);
  const header = Buffer.from(JSON.stringify(request));
  const length = Buffer.alloc(4);
  length.writeUInt32LE(header.length);
  child.stdin.write(length);
  child.stdin.write(header);
  for await (const chunk of file) if (!child.stdin.write(chunk)) await new Promise<void>((resolve) => { child.stdin.once('drain', resolve); child.once('close', () => resolve()); });
  child.stdin.end();
  const code = await ended;
  if (code !== 0) throw new Error(`The rebuild process ended with ${code}: ${complaint.slice(0, 2000)}`);
  return JSON.parse(output) as { meshHash: string; observationSha256: string };
};
