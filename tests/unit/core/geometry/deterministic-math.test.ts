import { describe, expect, it } from 'vitest';

import * as own from '#core/geometry/deterministic-math.ts';

/** Relative difference, in units of the last place of a double (2^-52). */
const ulps = (a: number, b: number): number => Math.abs(a - b) / (Math.abs(b) || 1) / 2 ** -52;

/** The platform's functions are an independent implementation, themselves within an ulp. */
describe('deterministic functions', () => {
  const spread = (from: number, to: number, count = 20_000): number[] => Array.from({ length: count }, (_, k) => from + ((to - from) * (k + 0.37)) / count);

  it.each([
    ['exp', own.exp, Math.exp, spread(-700, 700)],
    ['log', own.log, Math.log, spread(1e-9, 40).filter((x) => Math.abs(x - 1) > 1e-3)],
    ['asin', own.asin, Math.asin, spread(-1, 1)],
    ['acos', own.acos, Math.acos, spread(-1, 0.999)],
    ['tan', own.tan, Math.tan, spread(-1.5, 1.5)],
    ['atan', own.atan, Math.atan, spread(-50, 50)],
  ] as const)('%s agrees with the platform within 4 units in the last place', (_name, mine, theirs, xs) => {
    for (const x of xs) expect(ulps(mine(x), theirs(x)), `at ${x}`).toBeLessThan(4);
  });

  it.each([['sin', own.sin, Math.sin], ['cos', own.cos, Math.cos]] as const)('%s agrees with the platform within 1e-15 over many turns', (_name, mine, theirs) => {
    for (const x of spread(-1000, 1000)) expect(Math.abs(mine(x) - theirs(x)), `at ${x}`).toBeLessThan(1e-15);
  });

  it('atan2 gives the angle in every quadrant and on the axes', () => {
    for (const x of [-2, -1, -0.1, 0, 0.1, 1, 2]) for (const y of [-2, -1, -0.1, 0, 0.1, 1, 2]) expect(own.atan2(y, x)).toBeCloseTo(Math.atan2(y, x), 15);
  });

  it('sine and cosine of degrees are exact on the axes', () => {
    expect([0, 90, 180, 270, 360, -90].map(own.sinDegrees).map((v) => v + 0)).toEqual([0, 1, 0, -1, 0, -1]);
    expect([0, 90, 180, 270, 360, -90].map(own.cosDegrees).map((v) => v + 0)).toEqual([1, 0, -1, 0, 1, 0]);
  });

  it('keeps to the ends of the doubles', () => {
    expect(own.exp(710)).toBe(Infinity);
    expect(own.exp(-746)).toBe(0);
    expect(own.exp(-740)).toBe(Math.exp(-740));
    expect(own.log(0)).toBe(-Infinity);
    expect(own.log(-1)).toBeNaN();
    expect(own.log(5e-324)).toBeCloseTo(Math.log(5e-324), 12);
    expect(own.hypot(3e200, 4e200) / 5e200).toBeCloseTo(1, 15);
    expect(own.asin(1.0000001)).toBeNaN();
  });
});
