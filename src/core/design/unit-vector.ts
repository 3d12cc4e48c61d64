import { atan2, cos, sin } from '#core/geometry/deterministic-math.ts';

const DEGREE = Math.PI / 180;

/** Unit vector of a position in degrees, exact at the poles, whatever their longitude. */
export const writeUnitVector = (lon: number, lat: number, out: Float64Array, at: number): void => {
  if (lat === 90 || lat === -90) {
    out[at] = 0;
    out[at + 1] = 0;
    out[at + 2] = lat / 90;
    return;
  }
  const c = cos(lat * DEGREE);
  out[at] = c * cos(lon * DEGREE);
  out[at + 1] = c * sin(lon * DEGREE);
  out[at + 2] = sin(lat * DEGREE);
};

/** Longitude in [-180, 180) and latitude, degrees, of the direction of a vector of any positive length. */
export const lonLatOfVector = (x: number, y: number, z: number): [number, number] => {
  const lon = atan2(y, x) / DEGREE;
  const lat = atan2(z, Math.sqrt(x * x + y * y)) / DEGREE;
  return [lon >= 180 ? lon - 360 : lon, Math.max(-90, Math.min(90, lat))];
};
