export type SaveState =
  | { kind: 'saved' }
  | { kind: 'waiting' }
  | { kind: 'saving' }
  | { kind: 'failed'; reason: string }
  | { kind: 'conflict' };

/** What `save` found: `conflict` when somebody else saved first, `failed` when nothing reached the server. */
export type SaveOutcome = { kind: 'saved' } | { kind: 'conflict' } | { kind: 'failed'; reason: string };

export interface Autosave<T> {
  /** Notes the newest value; it is saved once no newer one came for the delay. */
  note(value: T): void;
  /** Saves what waits at once, and resolves when no save runs; false when something is still not saved. */
  flush(): Promise<boolean>;
  /** After a conflict is resolved: saving goes on. */
  resume(): void;
  destroy(): void;
}

const DELAY_MS = 700;
const RETRY_MS = 5000;

/** Saves a changing value, one request at a time; a failure is tried again, a conflict stops saving until `resume`. */
export const createAutosave = <T>(save: (value: T) => Promise<SaveOutcome>, onState: (state: SaveState) => void): Autosave<T> => {
  let waiting: { value: T } | null = null;
  let timer: ReturnType<typeof setTimeout> | undefined;
  let running: Promise<void> | null = null;
  let isStopped = false;
  let isDestroyed = false;

  const schedule = (ms: number): void => {
    clearTimeout(timer);
    timer = setTimeout(() => void run(), ms);
  };

  const run = async (): Promise<void> => {
    clearTimeout(timer);
    if (running || isStopped || isDestroyed || !waiting) return running ?? undefined;
    const { value } = waiting;
    waiting = null;
    onState({ kind: 'saving' });
    running = save(value).then((outcome) => {
      running = null;
      if (isDestroyed) return;
      if (outcome.kind === 'saved') {
        onState(waiting ? { kind: 'waiting' } : outcome);
        if (waiting) schedule(DELAY_MS);
        return;
      }
      waiting ??= { value };
      onState(outcome);
      if (outcome.kind === 'conflict') isStopped = true;
      else schedule(RETRY_MS);
    });
    return running;
  };

  return {
    note(value) {
      waiting = { value };
      if (isStopped) return;
      if (!running) onState({ kind: 'waiting' });
      schedule(DELAY_MS);
    },
    async flush() {
      await running;
      await run();
      return waiting === null && !isStopped;
    },
    resume() {
      isStopped = false;
      waiting = null;
    },
    destroy() {
      isDestroyed = true;
      clearTimeout(timer);
    },
  };
};
