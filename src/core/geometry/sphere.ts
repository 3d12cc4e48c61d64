import { asin, atan2, cosDegrees, degrees, sinDegrees } from './deterministic-math.ts';

/** Longitude in [-180, 180). */
export const normaliseLongitude = (lon: number): number => {
  if (lon >= -180 && lon < 180) return lon;
  const turned = lon - 360 * Math.floor((lon + 180) / 360);
  return turned >= 180 ? turned - 360 : turned;
};

/** Writes the unit vector of a longitude and latitude in degrees: x to (0, 0), y to (90, 0), z to the north pole. */
export const writeUnitVector = (lon: number, lat: number, out: Float64Array, at: number): void => {
  const c = cosDegrees(lat);
  out[at] = c * cosDegrees(lon);
  out[at + 1] = c * sinDegrees(lon);
  out[at + 2] = sinDegrees(lat);
};

/** Writes longitude in [-180, 180) and latitude, degrees, of a vector that need not be of unit length. */
export const writeLonLat = (x: number, y: number, z: number, out: Float64Array, at: number): void => {
  out[at] = normaliseLongitude(degrees(atan2(y, x)));
  out[at + 1] = degrees(atan2(z, Math.sqrt(x * x + y * y)));
};

/**
 * Great-circle distance in km between two places in degrees, by the haversine formula, which keeps its digits for
 * near places (Sinnott 1984, Sky & Telescope 68).
 */
export const greatCircleKm = (lon1: number, lat1: number, lon2: number, lat2: number, radiusKm: number): number => {
  const a = sinDegrees((lat2 - lat1) / 2);
  const b = sinDegrees((lon2 - lon1) / 2);
  const h = a * a + cosDegrees(lat1) * cosDegrees(lat2) * b * b;
  return 2 * radiusKm * asin(h >= 1 ? 1 : Math.sqrt(h));
};

/** Angle in radians between two unit vectors at offsets `i` and `j`, good for near and opposite ones alike. */
export const angleBetween = (a: Float64Array, i: number, b: Float64Array, j: number): number => {
  const cx = a[i + 1] * b[j + 2] - a[i + 2] * b[j + 1];
  const cy = a[i + 2] * b[j] - a[i] * b[j + 2];
  const cz = a[i] * b[j + 1] - a[i + 1] * b[j];
  return atan2(Math.sqrt(cx * cx + cy * cy + cz * cz), a[i] * b[j] + a[i + 1] * b[j + 1] + a[i + 2] * b[j + 2]);
};

/**
 * Area of a spherical triangle on the unit sphere (its spherical excess), positive where the vertices turn
 * counter-clockwise seen from outside: tan(E/2) = a·(b×c) / (1 + a·b + b·c + c·a) (Van Oosterom & Strackee 1983).
 */
export const sphericalExcess = (vectors: Float64Array, a: number, b: number, c: number): number => {
  const v = vectors;
  const dot = (i: number, j: number): number => v[i] * v[j] + v[i + 1] * v[j + 1] + v[i + 2] * v[j + 2];
  const triple =
    v[a] * (v[b + 1] * v[c + 2] - v[b + 2] * v[c + 1]) +
    v[a + 1] * (v[b + 2] * v[c] - v[b] * v[c + 2]) +
    v[a + 2] * (v[b] * v[c + 1] - v[b + 1] * v[c]);
  return 2 * atan2(triple, 1 + dot(a, b) + dot(b, c) + dot(c, a));
};
