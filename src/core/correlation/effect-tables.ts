/**
 * One-dimensional tables, lengths in diffusion scales, from which the boundary effect is predicted; built once per
 * number of steps. `rayDensity` h is the excess per radian of boundary seen at distance r, from Green's identity with
 * the Kirchhoff value 2 G on the boundary (Born & Wolf 1999, section 8.3, for the approximation): for
 * s - Laplacian it is sqrt(s) r K_0 K_1 / (2 pi²). A straight side at distance d gives exactly the image value:
 * the integral of h(d / cos a) over |a| < pi/2 is c(2d).
 */
import { discExcess } from './disc.ts';
import { maternCorrelation } from './matern.ts';
import { multiplySeries, relativeVariance, seriesK } from './power-series.ts';

/** Step of the tables, in scales: linear interpolation is good to 0.02 %. */
export const TABLE_STEP = 0.02;

/** Effects below this are left out of the prediction. */
const NEGLIGIBLE = 1e-8;

/** Boundary that is too far to add this share of the effect of the closest boundary is passed over. */
const NEGLIGIBLE_SHARE = 1e-3;

/** Curvature acts fully from this distance on (scales); nearer, the disc's excess diverges and says nothing local. */
const CURVATURE_FROM = 1;

export interface EffectTables {
  steps: number;
  /** Distance in scales beyond which a boundary has no effect worth adding. */
  reach: number;
  /** h at r = i TABLE_STEP. */
  rayDensity: Float64Array;
  /**
   * Gain of a boundary of curvature k at distance r: h is multiplied by 1 + k `gain`, which makes the centre of a disc
   * exact together with the second reflection h(2r).
   */
  gain: Float64Array;
  /** c(2x) at x = i TABLE_STEP: the excess that a straight side at distance x causes. */
  image: Float64Array;
  /** For a closest boundary vertex at r: the distance beyond which boundary adds less than a thousandth of the effect. */
  relativeReach: Float64Array;
}

/** h(r) for m steps, r in scales; 1/pi at r = 0. */
export function rayDensity(m: number, r: number): number {
  if (r < 1e-3) return 1 / Math.PI;
  return relativeVariance(m, multiplySeries(seriesK(0, r, m), seriesK(1, r, m))) / (2 * Math.PI * Math.PI);
}

const cache = new Map<number, EffectTables>();

/** The tables for m steps. */
export function effectTables(m: number): EffectTables {
  const known = cache.get(m);
  if (known) return known;
  let reach = 2;
  while (maternCorrelation(m, 2 * reach) > NEGLIGIBLE) reach += 0.5;
  const count = Math.ceil(reach / TABLE_STEP) + 2;
  const h = new Float64Array(count);
  for (let i = 0; i < count; i++) h[i] = rayDensity(m, i * TABLE_STEP);
  const gain = new Float64Array(count);
  const coarse = 10;
  const from = Math.round(CURVATURE_FROM / TABLE_STEP);
  const at = (i: number) => {
    const r = Math.max(from, i) * TABLE_STEP;
    const density = rayDensity(m, r);
    return r * ((discExcess(m, r) / (2 * Math.PI) - rayDensity(m, 2 * r)) / density - 1);
  };
  // smooth: every tenth value is computed, the others interpolated
  for (let i = 0; i < count; i += coarse) {
    const a = at(i);
    const b = at(i + coarse);
    for (let j = 0; j < coarse && i + j < count; j++) gain[i + j] = a + ((b - a) * j) / coarse;
  }
  const image = Float64Array.from(h, (_, i) => maternCorrelation(m, 2 * i * TABLE_STEP));
  const tables = { steps: m, reach, rayDensity: h, gain, image, relativeReach: relativeReachOf(h) };
  cache.set(m, tables);
  return tables;
}

function relativeReachOf(h: Float64Array): Float64Array {
  const out = new Float64Array(h.length);
  let far = 0;
  for (let i = 0; i < h.length; i++) {
    // a side at distance r has an effect of about h(r) pi / (1 + r), everything beyond R at most 2 pi h(R)
    const least = (NEGLIGIBLE_SHARE * h[i]) / (2 + 2 * i * TABLE_STEP);
    while (far + 1 < h.length && h[far] > least) far++;
    out[i] = far * TABLE_STEP;
  }
  return out;
}

/** Linear interpolation in a table of step TABLE_STEP; 0 beyond its end. */
export function lookUp(table: Float64Array, r: number): number {
  const at = r / TABLE_STEP;
  const i = Math.floor(at);
  if (i + 1 >= table.length) return 0;
  return table[i] + (table[i + 1] - table[i]) * (at - i);
}
