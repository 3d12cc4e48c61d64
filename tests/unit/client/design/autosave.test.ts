import { afterEach, beforeEach, describe, expect, it, vi } from 'vitest';

import type { SaveOutcome, SaveState } from '#client/design/autosave.ts';
import { createAutosave } from '#client/design/autosave.ts';

const made = (outcomes: SaveOutcome[]) => {
  const saved: number[] = [];
  const states: SaveState['kind'][] = [];
  const autosave = createAutosave<number>(
    async (value) => {
      saved.push(value);
      return outcomes.shift() ?? { kind: 'saved' };
    },
    (state) => states.push(state.kind),
  );
  return { autosave, saved, states };
};

describe('autosave', () => {
  beforeEach(() => void vi.useFakeTimers());
  afterEach(() => void vi.useRealTimers());

  it('saves once, the newest value, after a pause', async () => {
    const { autosave, saved, states } = made([]);
    for (const value of [1, 2, 3]) autosave.note(value);
    expect(saved).toEqual([]);
    await vi.advanceTimersByTimeAsync(2000);
    expect(saved).toEqual([3]);
    expect(states.at(-1)).toBe('saved');
  });

  it('keeps a value that could not be saved and tries again', async () => {
    const { autosave, saved, states } = made([{ kind: 'failed', reason: 'no connection' }]);
    autosave.note(1);
    await vi.advanceTimersByTimeAsync(1000);
    expect(states.at(-1)).toBe('failed');
    await vi.advanceTimersByTimeAsync(10_000);
    expect(saved).toEqual([1, 1]);
    expect(states.at(-1)).toBe('saved');
  });

  it('saves nothing more after a conflict until it is resumed', async () => {
    const { autosave, saved } = made([{ kind: 'conflict' }]);
    autosave.note(1);
    await vi.advanceTimersByTimeAsync(1000);
    autosave.note(2);
    await vi.advanceTimersByTimeAsync(60_000);
    expect(saved).toEqual([1]);
    expect(await autosave.flush()).toBe(false);
    autosave.resume();
    autosave.note(3);
    await vi.advanceTimersByTimeAsync(1000);
    expect(saved).toEqual([1, 3]);
  });

  it('flushes what waits at once', async () => {
    const { autosave, saved } = made([]);
    autosave.note(7);
    expect(await autosave.flush()).toBe(true);
    expect(saved).toEqual([7]);
  });

  it('is not flushed while a save fails', async () => {
    const { autosave } = made([{ kind: 'failed', reason: 'no connection' }]);
    autosave.note(7);
    expect(await autosave.flush()).toBe(false);
  });
});
