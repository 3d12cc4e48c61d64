import { describe, expect, it } from 'vitest';

import { projectLand } from '#client/map/land.ts';

const areaOf = (triangles: Float32Array): number => {
  let sum = 0;
  for (let k = 0; k < triangles.length; k += 6) {
    const [ax, ay, bx, by, cx, cy] = triangles.slice(k, k + 6);
    sum += Math.abs((bx - ax) * (cy - ay) - (cx - ax) * (by - ay)) / 2;
  }
  return sum;
};

/** A cap of land about the pole whose ring winds as in the shipped land: clockwise seen from above its inside. */
const cap = (lat: number): number[][][] => [[...Array.from({ length: 361 }, (_, k) => [180 - k, lat])].map(([lon, y]) => [lon, y])];

describe('land', () => {
  it('fills a cap that lies around the pole: the disc of radius 2 R tan(c/2) (Snyder 1987, 21-3)', () => {
    const { triangles } = projectLand([cap(80)], { crs: 'lonlat-deg', centre: [0, 90], radiusKm: 6371 }, 60);
    const radius = 2 * 6371 * Math.tan((5 * Math.PI) / 180);
    expect(areaOf(triangles) / (Math.PI * radius ** 2)).toBeCloseTo(1, 3);
  });

  it('fills a box across the antimeridian without a seam, and its hole stays open', () => {
    const box = (west: number, east: number, south: number, north: number): number[][] => [[west, south], [west, north], [east, north], [east, south], [west, south]];
    const frame = { crs: 'lonlat-deg' as const, centre: [180, 0] as [number, number], radiusKm: 6371 };
    const whole = projectLand([[box(178, -178, -2, 2)]], frame, 30);
    const holed = projectLand([[box(178, -178, -2, 2), box(179, -179, -1, 1).reverse()]], frame, 30);
    const degree = (6371 * Math.PI) / 180;
    expect(areaOf(whole.triangles) / (16 * degree ** 2)).toBeCloseTo(1, 2);
    expect(areaOf(holed.triangles) / (12 * degree ** 2)).toBeCloseTo(1, 2);
  });
});
