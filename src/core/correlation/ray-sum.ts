import type { EffectTables } from './effect-tables.ts';
import { lookUp } from './effect-tables.ts';

/** Rays per point: the ray sum of a straight side is exact to 1e-4 of its value. */
export const RAYS = 72;
export const RAY_STEP = (2 * Math.PI) / RAYS;
export const rayX = Float64Array.from({ length: RAYS }, (_, k) => Math.cos(k * RAY_STEP));
export const rayY = Float64Array.from({ length: RAYS }, (_, k) => Math.sin(k * RAY_STEP));

/**
 * A hole scatters, and its curvature k < 0 divides the effect by 1 + SCATTERING |k| gain: fitted to finite elements for
 * holes of radius 0.3 D to 2 D at 1 D and 1.5 D, m = 3, 4, 10, to 10 % of the value.
 */
const SCATTERING = 0.3;

/** The excess from each ray's first hit: `distance` in km (Infinity: none) and the boundary's `curvature` there in 1/km. */
export function excessOfRays(tables: EffectTables, distance: Float64Array, curvature: Float64Array, scaleKm: number): number {
  let sum = 0;
  for (let k = 0; k < RAYS; k++) {
    const r = distance[k] / scaleKm;
    if (r >= tables.reach) continue;
    const bend = curvature[k] * scaleKm * lookUp(tables.gain, r);
    sum += lookUp(tables.rayDensity, r) * (bend >= 0 ? 1 + bend : 1 / (1 - SCATTERING * bend));
    const both = r + distance[(k + RAYS / 2) % RAYS] / scaleKm;
    if (both < tables.reach) sum += lookUp(tables.rayDensity, both);
  }
  return sum * RAY_STEP;
}
