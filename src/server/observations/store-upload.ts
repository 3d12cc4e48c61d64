import { createHash, randomUUID } from 'node:crypto';
import { createWriteStream } from 'node:fs';
import { open, rm } from 'node:fs/promises';
import { tmpdir } from 'node:os';
import path from 'node:path';
import { Readable, Transform } from 'node:stream';
import { pipeline } from 'node:stream/promises';
import type { ReadableStream as WebStream } from 'node:stream/web';

import Busboy from '@fastify/busboy';
import { QueryTypes, type Transaction } from 'sequelize';

import { StoredFile } from '#db/models/StoredFile.ts';
import { StoredFileChunk } from '#db/models/StoredFileChunk.ts';

import { getDatabase } from '../database.ts';
import { getEnv } from '../env.ts';
import { AppError } from '../errors.ts';

const CHUNK = 1024 * 1024;

export interface ReceivedUpload {
  /** Temporary file with the bytes; `discard` removes it. */
  path: string;
  fileName: string;
  byteLength: number;
  sha256: string;
  fields: Map<string, string>;
  discard(): Promise<void>;
}

/** Text without control characters, halves of characters and outer blanks, at most `most` characters of it. */
export const tidyText = (text: string, most: number): string =>
  [...text.replace(/[\p{Cc}\p{Cf}\p{Cs}]/gu, '').trim()].slice(0, most).join('').trim();

/** File name as shown and offered again: without folders and control characters, at most 200 characters. */
export const tidyFileName = (name: string | undefined): string => {
  const base = tidyText((name ?? '').split(/[/\\]/).at(-1)!, 200);
  return base === '' || base === '.' || base === '..' ? 'observations' : base;
};

const tooLarge = (limit: number): AppError =>
  new AppError('BODY_TOO_LARGE', `The file is larger than the ${Math.round(limit / 1024 / 1024)} MB that an upload may have. Nothing was kept. Split it, or leave out rows that are not needed.`, { details: { limitBytes: limit } });

/**
 * Streams the one file of a multipart form to a temporary file. What fails half-way leaves nothing behind.
 * @throws AppError MEDIA_TYPE_UNSUPPORTED, BODY_TOO_LARGE, BAD_REQUEST
 */
export const receiveUpload = async (request: Request): Promise<ReceivedUpload> => {
  const type = request.headers.get('content-type') ?? '';
  if (!/^multipart\/form-data\b/i.test(type) || !request.body)
    throw new AppError('MEDIA_TYPE_UNSUPPORTED', 'An upload is a form with a part named "file". Send it as multipart/form-data.');
  const limit = getEnv().uploadLimitBytes;
  const target = path.join(tmpdir(), `selvage-upload-${randomUUID()}`);
  const discard = (): Promise<void> => rm(target, { force: true });
  const fields = new Map<string, string>();
  let fileName: string | undefined;
  let byteLength = 0;
  const hash = createHash('sha256');
  let writing: Promise<void> | undefined;
  try {
    const form = Busboy({ headers: { 'content-type': type }, limits: { files: 1, fields: 10, fieldSize: 64 * 1024, fileSize: limit + 1 } });
    form.on('field', (name: string, value: string) => fields.set(name, value));
    form.on('file', (_name: string, file: Readable, original: string) => {
      fileName = tidyFileName(original);
      const count = new Transform({
        transform(part: Buffer, _encoding, done) {
          byteLength += part.length;
          hash.update(part);
          done(byteLength > limit ? tooLarge(limit) : null, part);
        },
      });
      writing = pipeline(file, count, createWriteStream(target, { mode: 0o600 })).catch((error: unknown) => {
        form.destroy(error as Error);
        throw error;
      });
      writing.catch(() => undefined);
    });
    await pipeline(Readable.fromWeb(request.body as WebStream<Uint8Array>), form, { signal: request.signal });
    await writing;
    if (fileName === undefined) throw new AppError('BAD_REQUEST', 'The form has no file. Choose a file and send it as the part "file".');
    return { path: target, fileName, byteLength, sha256: hash.digest('hex'), fields, discard };
  } catch (error) {
    await discard();
    if (error instanceof AppError) throw error;
    if (request.signal.aborted) throw new AppError('BAD_REQUEST', 'The upload was broken off. Nothing was kept; send the file again.', { cause: error });
    throw new AppError('BAD_REQUEST', 'The upload could not be read as a form: it is cut short or malformed. Nothing was kept; send the file again.', { cause: error });
  }
};

/** Writes a received file into the database, chunk by chunk. */
export const storeFile = async (upload: ReceivedUpload, teamId: string, transaction: Transaction): Promise<StoredFile> => {
  const stored = await StoredFile.create({ teamId, fileName: upload.fileName, byteLength: upload.byteLength, sha256: upload.sha256 }, { transaction });
  const file = await open(upload.path, 'r');
  try {
    for (let number = 0; number * CHUNK < upload.byteLength; number++) {
      const bytes = Buffer.alloc(Math.min(CHUNK, upload.byteLength - number * CHUNK));
      await file.read(bytes, 0, bytes.length, number * CHUNK);
      await StoredFileChunk.create({ fileId: stored.id, number, bytes }, { transaction });
    }
  } finally {
    await file.close();
  }
  return stored;
};

/** The chunks of a stored file in order, one at a time. */
export async function* readStoredFile(fileId: string): AsyncGenerator<Buffer> {
  for (let number = 0; ; number++) {
    const chunk = await StoredFileChunk.findOne({ where: { fileId, number } });
    if (!chunk) return;
    yield chunk.bytes;
  }
}

/**
 * Deletes files that no observation set holds and no job will read any more: what was cancelled before it began, or
 * given up with its worker. Returns how many.
 */
export const removeUnreadFiles = async (): Promise<number> => {
  const rows = await getDatabase().query(
    `DELETE FROM stored_files f
     WHERE NOT EXISTS (SELECT 1 FROM observation_sets o WHERE o.file_id = f.id)
       AND NOT EXISTS (
         SELECT 1 FROM jobs j
         WHERE j.kind = 'read-observations' AND j.state IN ('queued', 'running', 'paused') AND j.payload ->> 'fileId' = f.id::text
       )
     RETURNING f.id`,
    { type: QueryTypes.SELECT },
  );
  return rows.length;
};
