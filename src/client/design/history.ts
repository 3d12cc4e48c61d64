/** States that can be gone back to, oldest first. */
export interface History<T> {
  past: T[];
  present: T;
  future: T[];
  /** Changes of one gesture (a drag, typing in one field) make one step; null between gestures. */
  gesture: string | null;
}

const MOST_STEPS = 200;

export const startHistory = <T>(present: T): History<T> => ({ past: [], present, future: [], gesture: null });

/** A step to `next`; one of the same gesture as the step before replaces it. */
export const changeTo = <T>(history: History<T>, next: T, gesture: string | null = null): History<T> => {
  if (Object.is(next, history.present)) return history;
  const isSameGesture = gesture !== null && gesture === history.gesture;
  const past = isSameGesture ? history.past : [...history.past, history.present].slice(-MOST_STEPS);
  return { past, present: next, future: [], gesture };
};

export const endGesture = <T>(history: History<T>): History<T> => (history.gesture === null ? history : { ...history, gesture: null });

export const undo = <T>({ past, present, future }: History<T>): History<T> =>
  past.length === 0
    ? { past, present, future, gesture: null }
    : { past: past.slice(0, -1), present: past[past.length - 1], future: [present, ...future], gesture: null };

export const redo = <T>({ past, present, future }: History<T>): History<T> =>
  future.length === 0
    ? { past, present, future, gesture: null }
    : { past: [...past, present], present: future[0], future: future.slice(1), gesture: null };
