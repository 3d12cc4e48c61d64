import { AsyncLocalStorage } from 'node:async_hooks';
import { once } from 'node:events';
import type { ServerResponse } from 'node:http';

/** Lets a streamed body know whether the client keeps up with it. */
export interface Flow {
  /** Resolves when more may be written, or when the client is gone. */
  ready(): Promise<void>;
}

// The server entry and the Astro build are two bundles: the store is shared through the global object.
const KEY = Symbol.for('selvage.flow');
const shared = globalThis as { [KEY]?: AsyncLocalStorage<Flow> };
const store = (shared[KEY] ??= new AsyncLocalStorage<Flow>());

/** Runs `work`, and all it starts, with the flow of `response`. */
export function withFlow<T>(response: ServerResponse, work: () => T): T {
  return store.run(watchFlow(response), work);
}

/** The flow of the request being answered; undefined outside the server entry (development server, tests of services). */
export function currentFlow(): Flow | undefined {
  return store.getStore();
}

/** Astro writes body chunks without looking at what `write` returns; this keeps that answer for the body's source to wait on. */
function watchFlow(response: ServerResponse): Flow {
  let isFull = false;
  const write = response.write.bind(response) as (...args: unknown[]) => boolean;
  response.write = ((...args: unknown[]) => {
    const hasRoom = write(...args);
    isFull = !hasRoom;
    return hasRoom;
  }) as typeof response.write;
  response.on('drain', () => (isFull = false));
  return {
    async ready() {
      if (!isFull || response.destroyed || response.writableEnded) return;
      const closed = new AbortController();
      await Promise.race([once(response, 'drain', { signal: closed.signal }), once(response, 'close', { signal: closed.signal })]).catch(() => {});
      closed.abort();
    },
  };
}
