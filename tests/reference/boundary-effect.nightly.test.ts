import { describe, expect, it } from 'vitest';

import { DOMAINS, compareCorrelation, compareVariance } from './boundary-cases.ts';

const isClose = ({ predicted, calculated }: { predicted: number; calculated: number }) =>
  Math.abs(predicted - calculated) <= Math.max(0.2 * calculated, 0.001);

describe('predicted variance excess against finite elements, all cases', () => {
  it.each(Object.keys(DOMAINS).flatMap((name) => [2, 3, 4, 6, 10].flatMap((steps) => [1, 1.5, 2.2, 3].map((buffer) => [name, steps, buffer] as const))))(
    '%s, m = %d, buffer %d D',
    (name, steps, buffer) => {
      const both = compareVariance(name, steps, buffer);
      expect(isClose(both), JSON.stringify(both)).toBe(true);
    },
    120_000,
  );
});

// only where the prediction claims it: one side dominates, or two parallel ones from 1.5 D on
describe('predicted correlation change against finite elements', () => {
  it.each([['strip', 3, 1.5], ['strip', 4, 1.5], ['disc of 4 buffers, off centre', 10, 1], ['disc of 4 buffers, off centre', 10, 1.5], ['square corner of 120 degrees', 10, 1]] as const)(
    '%s, m = %d, buffer %d D',
    (name, steps, buffer) => {
      const both = compareCorrelation(name, steps, buffer, 24);
      expect(isClose(both), JSON.stringify(both)).toBe(true);
    },
    120_000,
  );
});
