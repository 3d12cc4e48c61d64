import { writeLonLat, writeUnitVector } from './sphere.ts';

/**
 * Stereographic projection of the sphere (Snyder 1987, USGS Professional Paper 1395, p. 154-163), k0 = 1 at its
 * centre: conformal, and circles go to circles, so that the plane Delaunay triangulation of projected points is the
 * spherical one. Plane coordinates in km.
 */
export interface Stereographic {
  /** Writes plane x, y of a longitude and latitude in degrees. */
  forward(lon: number, lat: number, out: Float64Array, at: number): void;
  /** Writes longitude in [-180, 180) and latitude in degrees of a plane position. */
  inverse(x: number, y: number, out: Float64Array, at: number): void;
  /** Plane distance per distance on the ground at a plane position: 1 at the centre, 2 at 90 degrees from it. */
  scaleAt(x: number, y: number): number;
  /** Writes plane x, y of a unit vector. */
  forwardVector(vx: number, vy: number, vz: number, out: Float64Array, at: number): void;
  /** Writes the unit vector of a plane position. */
  inverseVector(x: number, y: number, out: Float64Array, at: number): void;
}

/** Projection with x to the east and y to the north at its centre (degrees); at a pole, east and north of its longitude. */
export const createStereographic = (centreLon: number, centreLat: number, radiusKm: number): Stereographic => {
  const frame = new Float64Array(9);
  writeUnitVector(centreLon, centreLat, frame, 0);
  writeUnitVector(centreLon + 90, 0, frame, 3);
  return createStereographicFrame(frame.subarray(0, 3), frame.subarray(3, 6), radiusKm);
};

/** Projection about the unit vector `centre` whose x axis is the unit vector `east`, at right angles to it. */
export const createStereographicFrame = (centre: Float64Array, east: Float64Array, radiusKm: number): Stereographic => {
  const [cx, cy, cz] = centre;
  const [ex, ey, ez] = east;
  const nx = cy * ez - cz * ey;
  const ny = cz * ex - cx * ez;
  const nz = cx * ey - cy * ex;
  const diameter = 2 * radiusKm;
  const vector = new Float64Array(3);

  const forwardVector = (vx: number, vy: number, vz: number, out: Float64Array, at: number): void => {
    const k = diameter / (1 + (vx * cx + vy * cy + vz * cz));
    out[at] = k * (vx * ex + vy * ey + vz * ez);
    out[at + 1] = k * (vx * nx + vy * ny + vz * nz);
  };
  const inverseVector = (x: number, y: number, out: Float64Array, at: number): void => {
    const s = x / diameter;
    const t = y / diameter;
    const r = s * s + t * t;
    const w = 1 / (1 + r);
    const a = (1 - r) * w;
    out[at] = a * cx + 2 * w * (s * ex + t * nx);
    out[at + 1] = a * cy + 2 * w * (s * ey + t * ny);
    out[at + 2] = a * cz + 2 * w * (s * ez + t * nz);
  };
  return {
    forwardVector,
    inverseVector,
    forward: (lon, lat, out, at) => {
      writeUnitVector(lon, lat, vector, 0);
      forwardVector(vector[0], vector[1], vector[2], out, at);
    },
    inverse: (x, y, out, at) => {
      inverseVector(x, y, vector, 0);
      writeLonLat(vector[0], vector[1], vector[2], out, at);
    },
    scaleAt: (x, y) => 1 + (x * x + y * y) / (diameter * diameter),
  };
};
