import { describe, expect, it } from 'vitest';

import { axisTicks, bufferStep, elementTicks, niceStep, powerTicks, roundBuffer } from '#client/design/margin-scale.ts';

describe('margin scale', () => {
  it('lays elements of one size evenly when they do not grow', () => {
    const ticks = elementTicks(100, 10, 1);
    expect(ticks).toHaveLength(9);
    ticks.forEach((km, k) => expect(km).toBeCloseTo(10 * (k + 1), 9));
  });

  it('lets each element be the growth times the one before', () => {
    const ticks = [0, ...elementTicks(500, 10, 1.2)];
    for (let k = 2; k < ticks.length; k++) expect((ticks[k] - ticks[k - 1]) / (ticks[k - 1] - ticks[k - 2])).toBeCloseTo(1.2, 9);
  });

  it('takes round steps', () => {
    expect([niceStep(7.3), niceStep(0.024), niceStep(10)]).toEqual([5, 0.02, 10]);
    expect(bufferStep(310)).toBe(5);
    expect(roundBuffer(310.4567)).toBe(310);
  });

  it('has at most as many axis ticks as asked for, from 0', () => {
    for (const end of [0.37, 5, 99, 1234])
      for (const most of [3, 6, 10]) {
        const ticks = axisTicks(end, most);
        expect(ticks[0]).toBe(0);
        expect(ticks.length).toBeGreaterThan(1);
        expect(ticks.length).toBeLessThanOrEqual(most + 1);
        expect(ticks.at(-1)).toBeLessThanOrEqual(end * 1.000001);
      }
  });

  it('marks the powers of ten of a range', () => {
    expect(powerTicks(0.001, 1)).toEqual([0.001, 0.01, 0.1, 1]);
  });
});
