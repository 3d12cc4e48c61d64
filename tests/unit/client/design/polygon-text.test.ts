import { describe, expect, it } from 'vitest';

import { readRing, writeRing } from '#client/design/polygon-text.ts';

describe('polygon text', () => {
  it('reads corners with any of the usual separators, and drops a repeated first corner', () => {
    expect(readRing('0, 0\n10;0\n10\t10\n0 0', 'plane-km')).toEqual({ ring: [[0, 0], [10, 0], [10, 10]] });
  });

  it('reads back what it wrote', () => {
    const ring: [number, number][] = [[-3.25, 54], [1e-3, 60.5], [7, 51]];
    expect(readRing(writeRing(ring), 'lonlat-deg')).toEqual({ ring });
  });

  it('takes an empty text for no polygon', () => {
    expect(readRing(' \n ', 'plane-km')).toEqual({});
  });

  it.each([
    ['1, 2\nx, 3\n4, 5', 'Line 2'],
    ['1, 2, 3\n4, 5\n6, 7', 'Line 1'],
    ['10, 95\n0, 0\n5, 5', 'latitude 95'],
    ['1, 2\n3, 4', 'at least three corners'],
  ])('tells what is wrong with %j', (text, words) => {
    expect(readRing(text, 'lonlat-deg')).toEqual({ problem: expect.stringContaining(words) });
  });
});
