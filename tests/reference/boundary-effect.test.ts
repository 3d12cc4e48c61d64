import { describe, expect, it } from 'vitest';

import { DOMAINS, compareVariance } from './boundary-cases.ts';

/** Within 20 % of the value or 0.1 percentage points: the bound that the prediction has to keep. */
const isClose = ({ predicted, calculated }: { predicted: number; calculated: number }) =>
  Math.abs(predicted - calculated) <= Math.max(0.2 * calculated, 0.001);

// finite elements on the bounded mesh against the same mesh continued outwards; all of them in the nightly sweep
describe('predicted variance excess against finite elements', () => {
  it.each(Object.keys(DOMAINS).flatMap((name, k) => [[name, [3, 4, 10][k % 3], 1], [name, [4, 10, 3][k % 3], 1.5]] as const))(
    '%s, m = %d, buffer %d D',
    (name, steps, buffer) => {
      const both = compareVariance(name, steps, buffer);
      expect(isClose(both), JSON.stringify(both)).toBe(true);
    },
  );
});
