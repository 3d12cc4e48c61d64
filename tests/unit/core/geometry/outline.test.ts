import { describe, expect, it } from 'vitest';

import { convexHull } from '#core/geometry/convex-hull.ts';
import { ARC_STEP, bufferPlane, distanceOutsidePlane } from '#core/geometry/plane-outline.ts';
import { writeUnitVector } from '#core/geometry/sphere.ts';
import { bufferSphere, distanceOutsideSphere } from '#core/geometry/sphere-outline.ts';
import { createStereographic } from '#core/geometry/stereographic.ts';
import { distanceToRing } from '#support/outline-distance.ts';
import { bell, ring as circle, scattered, seeded } from '#support/point-sets.ts';

const R = 6371;

const flat = (places: (readonly [number, number])[]): Float64Array => Float64Array.from(places.flat());
const hullOf = (places: [number, number][]): Float64Array => flat(Array.from(convexHull(flat(places)), (i) => places[i]));
const vectors = (ring: Float64Array): Float64Array => {
  const out = new Float64Array((3 * ring.length) / 2);
  for (let k = 0; k < ring.length / 2; k++) writeUnitVector(ring[2 * k], ring[2 * k + 1], out, 3 * k);
  return out;
};
const edges = (boundary: Float64Array): number[] =>
  Array.from({ length: boundary.length / 2 }, (_, k) => {
    const j = (2 * k + 2) % boundary.length;
    return Math.hypot(boundary[j] - boundary[2 * k], boundary[j + 1] - boundary[2 * k + 1]);
  });

const rings: { name: string; ring: Float64Array }[] = [
  { name: 'a triangle', ring: flat([[0, 0], [100, 0], [30, 60]]) },
  { name: 'a needle', ring: flat([[0, 0], [200, -0.001], [200, 0.001]]) },
  { name: 'a hull with short sides', ring: hullOf(bell(300, 4, 40)) },
  { name: 'a circle of a thousand corners', ring: flat(circle(1000, 150)) },
];

describe.each(rings)('the boundary round $name', ({ ring }) => {
  const bufferKm = 80;

  it.each([10, 40])('stays within 1 % of the buffer, edges up to %i km', (edgeKm) => {
    const { boundary } = bufferPlane(ring, bufferKm, edgeKm, 'round');
    for (let k = 0; k < boundary.length; k += 2)
      for (const share of [0, 0.3, 0.5, 0.7]) {
        const j = (k + 2) % boundary.length;
        const d = distanceToRing('plane-km', ring, boundary[k] + share * (boundary[j] - boundary[k]), boundary[k + 1] + share * (boundary[j + 1] - boundary[k + 1]), R);
        expect(Math.abs(d / bufferKm - 1)).toBeLessThan(0.01);
      }
  });

  it('has no edge longer than asked, nor one much shorter than its neighbours', () => {
    const lengths = edges(bufferPlane(ring, bufferKm, 30, 'round').boundary);
    expect(Math.max(...lengths)).toBeLessThan(30 * (1 + 1e-9));
    for (const [k, length] of lengths.entries()) expect(length / lengths[(k + 1) % lengths.length]).toBeGreaterThan(0.5);
  });

  it('turns once round in all: the curvatures times the lengths of the offset curve sum to 2 pi (Hopf 1935)', () => {
    const { boundary, curvature, turning } = bufferPlane(ring, bufferKm, 5, 'round');
    expect(turning.reduce((sum, angle) => sum + angle, 0)).toBeCloseTo(2 * Math.PI, 9);
    // chords are shorter than arcs by less than (5 / 80)² / 24
    const sum = edges(boundary).reduce((total, length, k) => total + length * curvature[k], 0);
    expect(sum / (2 * Math.PI)).toBeGreaterThan(1 - 2e-4);
    expect(sum / (2 * Math.PI)).toBeLessThan(1 + 1e-9);
  });

  it('squared off is nowhere nearer than the buffer less 1 %, nor farther than sqrt(2) buffers, its meeting points being vertices', () => {
    const { boundary, isRounded, turning } = bufferPlane(ring, bufferKm, 25, 'square');
    let farthest = 0;
    for (let k = 0; k < boundary.length; k += 2) {
      const j = (k + 2) % boundary.length;
      const d = distanceToRing('plane-km', ring, boundary[k], boundary[k + 1], R);
      const middle = distanceToRing('plane-km', ring, (boundary[k] + boundary[j]) / 2, (boundary[k + 1] + boundary[j + 1]) / 2, R);
      expect(Math.min(d, middle)).toBeGreaterThan(0.99 * bufferKm);
      expect(d).toBeLessThan(Math.SQRT2 * bufferKm * (1 + 1e-12));
      farthest = Math.max(farthest, d);
    }
    const reach = Math.max(...Array.from(turning, (angle) => 1 / Math.cos(angle / 2 / Math.max(1, Math.ceil(angle / (Math.PI / 2))))));
    if (isRounded.includes(false)) expect(farthest / bufferKm).toBeCloseTo(reach, 9);
    expect(isRounded).toEqual(Array.from(turning, (angle) => angle <= ARC_STEP));
  });
});

describe('distance to an outline', () => {
  it.each(rings)('is the least of all sides: $name', ({ ring }) => {
    const distance = distanceOutsidePlane(ring);
    const random = seeded(8);
    const isInside = (x: number, y: number): boolean =>
      Array.from({ length: ring.length / 2 }, (_, k) => 2 * k).every((k) => {
        const j = (k + 2) % ring.length;
        return (ring[j] - ring[k]) * (y - ring[k + 1]) - (ring[j + 1] - ring[k + 1]) * (x - ring[k]) >= 0;
      });
    for (let k = 0; k < 2000; k++) {
      const [x, y] = [800 * (random() - 0.5), 800 * (random() - 0.5)];
      const expected = isInside(x, y) ? 0 : distanceToRing('plane-km', ring, x, y, R);
      expect(distance(x, y)).toBeCloseTo(expected, 9);
    }
  });

  it.each([
    ['small', 8, 60],
    ['as wide as a hemisphere', 70, 75],
    ['small, from places beyond 90 degrees', 8, 170],
  ])('on the sphere is the least of all sides: %s', (_name, radius, farthest) => {
    // corners on a wobbling ring about the pole; the hull of its stereographic image is convex on the sphere for a circle
    const ring = flat(Array.from({ length: 60 }, (_, k): [number, number] => [6 * k - 180, 90 - radius]));
    const projection = createStereographic(0, 90, R);
    const distance = distanceOutsideSphere(vectors(ring), R, projection);
    const random = seeded(9);
    const plane = new Float64Array(2);
    for (let k = 0; k < 500; k++) {
      const [lon, lat] = [360 * random() - 180, 90 - radius - 0.2 - (farthest - radius) * random()];
      projection.forward(lon, lat, plane, 0);
      expect(distance(plane[0], plane[1])).toBeCloseTo(distanceToRing('lonlat-deg', ring, lon, lat, R), 6);
    }
    projection.forward(10, 90 - radius / 2, plane, 0);
    expect(distance(plane[0], plane[1])).toBe(0);
  });
});

describe('the boundary on the sphere', () => {
  const ring = flat([[-160, 60], [170, 50], [-170, 45], [-150, 52]]);

  it.each(['round', 'square'] as const)('keeps the buffer (%s corners) across the antimeridian', (corners) => {
    const projection = createStereographic(-170, 52, R);
    const corner = vectors(ring);
    const { boundary } = bufferSphere(corner, 700, 150, corners, R, projection);
    const place = new Float64Array(2);
    for (let k = 0; k < boundary.length; k += 2) {
      projection.inverse(boundary[k], boundary[k + 1], place, 0);
      const d = distanceToRing('lonlat-deg', ring, place[0], place[1], R) / 700;
      expect(d).toBeGreaterThan(1 - 1e-9);
      expect(d).toBeLessThan(corners === 'round' ? 1 + 1e-9 : 1.45);
    }
  });

  it('has the geodesic curvature cot(b)/R on arcs', () => {
    const { curvature } = bufferSphere(vectors(ring), 700, 60, 'round', R, createStereographic(-170, 52, R));
    expect(Math.max(...curvature)).toBeCloseTo(1 / (R * Math.tan(700 / R)), 12);
  });
});

describe('convex hull', () => {
  it('has every point on its left and no three corners on a line', () => {
    for (const places of [scattered(200, 1, [0, 0, 1, 1]), bell(500, 2, 3), [[0, 0], [1, 0], [2, 0], [2, 2], [1, 1], [0, 2], [0, 1], [2, 0]] as [number, number][]]) {
      const points = flat(places);
      const hull = convexHull(points);
      for (const [k, a] of hull.entries()) {
        const b = hull[(k + 1) % hull.length];
        const c = hull[(k + 2) % hull.length];
        const cross = (i: number): number => (points[2 * b] - points[2 * a]) * (points[2 * i + 1] - points[2 * a + 1]) - (points[2 * b + 1] - points[2 * a + 1]) * (points[2 * i] - points[2 * a]);
        expect(cross(c)).toBeGreaterThan(0);
        for (let i = 0; i < places.length; i++) expect(cross(i)).toBeGreaterThanOrEqual(-1e-15);
      }
    }
  });

  it('of points on one line has its two ends, of one place one', () => {
    expect([...convexHull(flat([[1, 1], [0, 0], [3, 3], [2, 2]]))]).toHaveLength(2);
    expect([...convexHull(flat([[1, 1], [1, 1]]))]).toHaveLength(1);
  });
});
