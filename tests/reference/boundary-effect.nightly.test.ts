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
void compareCorrelation;
