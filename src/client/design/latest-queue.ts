export interface LatestQueue<T> {
  /** Runs `request` at once when idle; otherwise it waits, in place of any request that waited before it. */
  push(request: T): void;
  /** Drops the waiting request; the running one finishes. */
  clear(): void;
  readonly isBusy: boolean;
}

/**
 * One request at a time, and only the newest of those that came meanwhile: work in progress is finished, so a steady
 * stream of requests still gives results. `run` must not reject.
 */
export const createLatestQueue = <T>(run: (request: T) => Promise<void>, onIdle?: () => void): LatestQueue<T> => {
  let waiting: { request: T } | null = null;
  let isBusy = false;

  const start = async (first: T): Promise<void> => {
    isBusy = true;
    for (let next: { request: T } | null = { request: first }; next; ) {
      await run(next.request);
      next = waiting;
      waiting = null;
    }
    isBusy = false;
    onIdle?.();
  };

  return {
    push(request) {
      if (isBusy) waiting = { request };
      else void start(request);
    },
    clear() {
      waiting = null;
    },
    get isBusy() {
      return isBusy;
    },
  };
};
