import { createReadStream } from 'node:fs';
import { stat } from 'node:fs/promises';

import { currentFlow } from './http/flow.ts';

export interface SendOptions {
  mediaType: string;
  /** Offered as a download under this name. */
  fileName?: string;
  /** Known size in bytes. */
  length?: number;
  /** Strong validator, without quotes: usually a content hash. */
  etag?: string;
  /** Default: private, no-cache (revalidated each time). */
  cacheControl?: string;
}

/** Answers with bytes already at hand. */
export function sendBytes(bytes: Uint8Array, options: SendOptions): Response {
  return new Response(bytes as Uint8Array<ArrayBuffer>, { headers: headersOf({ ...options, length: bytes.byteLength }) });
}

/**
 * Answers with chunks as they come, never further ahead of the client than one chunk; the source is closed when the
 * client leaves.
 */
export function sendStream(source: AsyncIterable<Uint8Array>, options: SendOptions): Response {
  const flow = currentFlow();
  const iterator = source[Symbol.asyncIterator]();
  const body = new ReadableStream<Uint8Array>(
    {
      async pull(controller) {
        await flow?.ready();
        const next = await iterator.next();
        if (next.done) controller.close();
        else controller.enqueue(next.value);
      },
      async cancel() {
        await iterator.return?.();
      },
    },
    { highWaterMark: 0 },
  );
  return new Response(body, { headers: headersOf(options) });
}

/** Answers with a file of this machine. @throws the file system's error when it is missing */
export async function sendFile(path: string, options: Omit<SendOptions, 'length'>): Promise<Response> {
  const { size } = await stat(path);
  return sendStream(createReadStream(path, { highWaterMark: 256 * 1024 }), { ...options, length: size });
}

/** 304 when the client already has what `etag` names, else undefined. */
export function respondNotModified(request: Request, etag: string): Response | undefined {
  const known = request.headers.get('if-none-match')?.split(',').map((one) => one.trim().replace(/^W\//, ''));
  if (known === undefined || !(known.includes(`"${etag}"`) || known.includes('*'))) return undefined;
  return new Response(null, { status: 304, headers: { etag: `"${etag}"`, 'cache-control': 'private, no-cache' } });
}

function headersOf(options: SendOptions): Record<string, string> {
  return {
    'content-type': options.mediaType,
    'cache-control': options.cacheControl ?? 'private, no-cache',
    ...(options.length !== undefined && { 'content-length': String(options.length) }),
    ...(options.etag !== undefined && { etag: `"${options.etag}"` }),
    ...(options.fileName !== undefined && { 'content-disposition': contentDisposition(options.fileName) }),
  };
}

/** RFC 6266: an ASCII name for old clients, and the exact one in UTF-8. */
export function contentDisposition(fileName: string): string {
  const plain = fileName.replace(/[^\x20-\x7e]|["\\]/g, '_');
  const exact = encodeURIComponent(fileName).replace(/['()*]/g, (c) => `%${c.charCodeAt(0).toString(16).toUpperCase()}`);
  return `attachment; filename="${plain}"; filename*=UTF-8''${exact}`;
}
