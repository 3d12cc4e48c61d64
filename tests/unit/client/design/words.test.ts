import { describe, expect, it } from 'vitest';

import { formatAgainst, formatElapsed, formatKm, formatPercent, formatPosition, marginSentence } from '#client/design/words.ts';

describe('words', () => {
  it('says what the margin strip shows', () => {
    const figures = { bufferKm: 310, daleyKm: 148, scaleKm: 74, worst: 0.0072, observation: 214, tolerance: 0.01 };
    expect(marginSentence(figures)).toBe('Buffer 310 km = 2.1 D. Largest boundary effect 0.72 % (limit 1 %), at observation 214.');
    expect(marginSentence({ ...figures, daleyKm: null, worst: null })).toBe('Buffer 310 km = 4.2 l.');
  });

  it('tells a value just beyond the limit from the limit', () => {
    expect(formatAgainst(0.01003, 0.01)).toBe('1.003 %');
    expect(formatAgainst(0.007, 0.01)).toBe('0.7 %');
    expect(formatAgainst(0.01, 0.01)).toBe('1 %');
  });

  it('writes distances, shares, places and times', () => {
    expect([formatKm(0.8512), formatKm(12.345), formatKm(1250.4)]).toEqual(['0.851 km', '12.3 km', '1,250 km']);
    expect([formatPercent(0), formatPercent(0.000341), formatPercent(1e-9)]).toEqual(['0 %', '0.034 %', 'under 0.0001 %']);
    expect(formatPosition(-3.05, 54.2, 'lonlat-deg')).toBe('54.2° N 3.05° W');
    expect([formatElapsed(3.9), formatElapsed(125)]).toEqual(['3 s', '2 min 5 s']);
  });
});
