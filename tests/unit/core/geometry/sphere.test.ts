import { describe, expect, it } from 'vitest';

import { greatCircleKm, normaliseLongitude, sphericalExcess, writeLonLat, writeUnitVector } from '#core/geometry/sphere.ts';
import { createStereographic } from '#core/geometry/stereographic.ts';

const R = 6371;

const vectorsOf = (...places: [number, number][]): Float64Array => {
  const v = new Float64Array(3 * places.length);
  for (const [k, [lon, lat]] of places.entries()) writeUnitVector(lon, lat, v, 3 * k);
  return v;
};

describe('great-circle distance', () => {
  it('is a quarter, a half and a degree of the circumference where geometry says so', () => {
    expect(greatCircleKm(0, 0, 90, 0, R)).toBeCloseTo((Math.PI * R) / 2, 9);
    expect(greatCircleKm(12, 34, -168, -34, R)).toBeCloseTo(Math.PI * R, 6);
    expect(greatCircleKm(57, 10, 57, 11, R)).toBeCloseTo((Math.PI * R) / 180, 9);
  });

  it('crosses the antimeridian and the pole by the short way', () => {
    expect(greatCircleKm(179.5, 0, -179.5, 0, R)).toBeCloseTo((Math.PI * R) / 180, 9);
    expect(greatCircleKm(0, 89, 180, 89, R)).toBeCloseTo((2 * Math.PI * R) / 180, 9);
  });

  it('keeps its digits a millimetre apart', () => {
    const metre = 180 / (Math.PI * R * 1000);
    expect(greatCircleKm(10, 0, 10 + metre / 1000, 0, R)).toBeCloseTo(1e-6, 12);
  });

  it('agrees with the spherical law of cosines', () => {
    // a triangle's side from the two others and the angle between them (spherical law of cosines; Snyder 1987, eq. 5-3)
    const rad = Math.PI / 180;
    const c = Math.acos(Math.sin(52 * rad) * Math.sin(-33 * rad) + Math.cos(52 * rad) * Math.cos(-33 * rad) * Math.cos(141 * rad));
    expect(greatCircleKm(10, 52, 151, -33, R)).toBeCloseTo(R * c, 7);
  });
});

describe('spherical excess', () => {
  it('of an octant is pi/2 (Girard)', () => {
    expect(sphericalExcess(vectorsOf([0, 0], [90, 0], [0, 90]), 0, 3, 6)).toBeCloseTo(Math.PI / 2, 14);
  });

  it('is negative for the other turning sense and adds up over a lune', () => {
    const v = vectorsOf([0, 90], [0, 0], [40, 0], [0, -90]);
    expect(sphericalExcess(v, 0, 6, 3)).toBeCloseTo(-sphericalExcess(v, 0, 3, 6), 15);
    // a lune of angle 40 degrees has area 2 * 40 degrees in radians on the unit sphere
    expect(sphericalExcess(v, 0, 3, 6) + sphericalExcess(v, 3, 9, 6)).toBeCloseTo((2 * 40 * Math.PI) / 180, 14);
  });
});

describe('longitude and latitude', () => {
  it('survive the way to a vector and back', () => {
    const v = new Float64Array(3);
    const out = new Float64Array(2);
    for (const [lon, lat] of [[-180, 0], [179.999, 12], [-77.3, -88], [0, 0], [45, 89.9999]] as const) {
      writeUnitVector(lon, lat, v, 0);
      writeLonLat(v[0], v[1], v[2], out, 0);
      expect(out[0]).toBeCloseTo(lon, 9);
      expect(out[1]).toBeCloseTo(lat, 12);
    }
  });

  it('come into [-180, 180)', () => {
    expect([180, 190, 360, -180, 540, -190].map(normaliseLongitude)).toEqual([-180, -170, 0, -180, -180, 170]);
  });
});

describe('stereographic projection', () => {
  it('gives the worked example of Snyder 1987 (USGS PP 1395, p. 312, sphere, oblique aspect)', () => {
    // R = 1, centre 40 N 100 W, place 30 N 75 W: x = 0.3807224, y = -0.1263802, k = 1.0402304
    const projection = createStereographic(-100, 40, 1);
    const out = new Float64Array(2);
    projection.forward(-75, 30, out, 0);
    expect(out[0]).toBeCloseTo(0.3807224, 7);
    expect(out[1]).toBeCloseTo(-0.1263802, 7);
    expect(projection.scaleAt(out[0], out[1])).toBeCloseTo(1.0402304, 7);
  });

  it('is inverse to itself, poles and antimeridian included', () => {
    const out = new Float64Array(2);
    const back = new Float64Array(2);
    for (const [clon, clat] of [[0, 90], [179, -20], [-60, 0], [12, -90]] as const) {
      const projection = createStereographic(clon, clat, R);
      for (const [lon, lat] of [[-179.5, -10], [clon, clat], [100, 5], [-1, 60]] as const) {
        projection.forward(lon, lat, out, 0);
        projection.inverse(out[0], out[1], back, 0);
        expect(greatCircleKm(lon, lat, back[0], back[1], R)).toBeLessThan(1e-8);
      }
    }
  });

  it('takes circles to circles: a small circle has one radius about one centre', () => {
    const projection = createStereographic(20, 50, R);
    const p = new Float64Array(2);
    // parallels of latitude: the circle through three of their points holds a fourth
    const points = [-60, 0, 70, 110].map((lon): [number, number] => {
      projection.forward(lon, 35, p, 0);
      return [p[0], p[1]];
    });
    const [[ax, ay], [bx, by], [cx, cy], [dx, dy]] = points;
    const d = 2 * (ax * (by - cy) + bx * (cy - ay) + cx * (ay - by));
    const ux = ((ax * ax + ay * ay) * (by - cy) + (bx * bx + by * by) * (cy - ay) + (cx * cx + cy * cy) * (ay - by)) / d;
    const uy = ((ax * ax + ay * ay) * (cx - bx) + (bx * bx + by * by) * (ax - cx) + (cx * cx + cy * cy) * (bx - ax)) / d;
    expect(Math.hypot(dx - ux, dy - uy)).toBeCloseTo(Math.hypot(ax - ux, ay - uy), 6);
  });
});
