import { describe, expect, it } from 'vitest';

import { changeTo, endGesture, redo, startHistory, undo } from '#client/design/history.ts';

describe('history', () => {
  it('goes back and forth through every change', () => {
    let history = startHistory('a');
    for (const next of ['b', 'c']) history = changeTo(history, next);
    history = undo(undo(history));
    expect(history.present).toBe('a');
    history = redo(redo(history));
    expect(history.present).toBe('c');
    expect(redo(history).present).toBe('c');
  });

  it('makes one step of a drag, and another of the next drag', () => {
    let history = startHistory(0);
    for (let km = 1; km <= 20; km++) history = changeTo(history, km, 'boundary');
    history = endGesture(history);
    for (let km = 21; km <= 40; km++) history = changeTo(history, km, 'boundary');
    expect(undo(history).present).toBe(20);
    expect(undo(undo(history)).present).toBe(0);
    expect(undo(undo(history)).past).toEqual([]);
  });

  it('does not join changes of different gestures or without one', () => {
    let history = startHistory(0);
    history = changeTo(history, 1, 'buffer');
    history = changeTo(history, 2, 'growth');
    history = changeTo(history, 3);
    history = changeTo(history, 4);
    expect(history.past).toEqual([0, 1, 2, 3]);
  });

  it('forgets what was undone when something else is changed', () => {
    const history = changeTo(undo(changeTo(startHistory('a'), 'b')), 'c');
    expect(history.future).toEqual([]);
    expect(undo(history).present).toBe('a');
  });

  it('starts a new step after an undo within the same gesture', () => {
    const history = changeTo(undo(changeTo(startHistory(0), 1, 'boundary')), 2, 'boundary');
    expect(undo(history).present).toBe(0);
  });
});
