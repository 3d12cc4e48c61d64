import { describe, expect, it } from 'vitest';

import { createColourScale, lightness, readHex, SCALE_STEPS } from '#client/map/colour-scale.ts';

const at = (scale: Uint8Array, k: number): [number, number, number] => [scale[4 * k] / 255, scale[4 * k + 1] / 255, scale[4 * k + 2] / 255];

describe('colour scale', () => {
  // OKLab values of the primaries, Ottosson 2020
  it('has the published lightness', () => {
    expect(lightness([1, 1, 1])).toBeCloseTo(1, 4);
    expect(lightness([1, 0, 0])).toBeCloseTo(0.628, 3);
    expect(lightness([0, 1, 0])).toBeCloseTo(0.8664, 3);
    expect(lightness([0, 0, 1])).toBeCloseTo(0.452, 3);
  });

  it.each([
    ['light', ['#f3e6bf', '#2a5783', '#1b2233']],
    ['dark', ['#3d3214', '#86b4e2', '#ece6d9']],
  ])('goes one way in lightness in the %s theme, from the first colour to the last', (_, stops) => {
    const scale = createColourScale(stops.map(readHex));
    const steps = Array.from({ length: SCALE_STEPS }, (_unused, k) => lightness(at(scale, k)));
    const sign = Math.sign(steps[SCALE_STEPS - 1] - steps[0]);
    for (let k = 1; k < SCALE_STEPS; k++) expect(sign * (steps[k] - steps[k - 1])).toBeGreaterThan(-0.002);
    at(scale, 0).forEach((c, k) => expect(c).toBeCloseTo(readHex(stops[0])[k], 2));
    at(scale, SCALE_STEPS - 1).forEach((c, k) => expect(c).toBeCloseTo(readHex(stops[2])[k], 2));
  });
});
