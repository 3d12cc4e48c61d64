/**
 * The boundary effect at the centre of a disc with a natural boundary, in closed form: the Neumann Green's function of
 * s - Laplacian exceeds the free one by K_1(sqrt(s) B) / (2 pi I_1(sqrt(s) B)) there (Carslaw & Jaeger 1959, ch. 14;
 * DLMF 10.28.2), and m implicit steps take its (m-1)-th derivative in s, here in truncated power series.
 */
import { NumericalError } from '#core/errors.ts';
import { divideSeries, relativeVariance, seriesI, seriesK, timesS } from './power-series.ts';

/** Beyond this many scales the effect is below 1e-150 and returned as 0. */
const FARTHEST = 300;

/** Relative excess of the variance at the centre of a disc of radius B = `radiusOverL` l, for m >= 2 steps. */
export function discExcess(m: number, radiusOverL: number): number {
  checkRadius(radiusOverL);
  if (radiusOverL > FARTHEST) return 0;
  const ratio = divideSeries(seriesK(1, radiusOverL, m), seriesI(1, radiusOverL, m));
  return relativeVariance(m, ratio) / (2 * Math.PI);
}

/**
 * Relative change of either derivative's variance (velocity from stream function or potential) at the centre of a
 * disc, m >= 3: the n = 1 term -s K_1'/(4 pi I_1') of the disc's Green's function, relative to 1/D². Negative for
 * small discs. DLMF 10.29.2 for the derivatives.
 */
export function discDerivativeExcess(m: number, radiusOverL: number): number {
  checkRadius(radiusOverL);
  if (radiusOverL > FARTHEST) return 0;
  const x = radiusOverL;
  // -z^2 K_1' = z^2 K_0 + z K_1 and z^2 I_1' = z^2 I_0 - z I_1, with z^2 = s x^2
  const square = (a: Float64Array) => timesS(a).map((value) => value * x * x);
  const k1 = seriesK(1, x, m);
  const i1 = seriesI(1, x, m);
  const top = square(seriesK(0, x, m)).map((value, i) => value + k1[i]);
  const bottom = square(seriesI(0, x, m)).map((value, i) => value - i1[i]);
  return (relativeVariance(m, timesS(divideSeries(top, bottom))) * (2 * m - 4)) / (4 * Math.PI);
}

function checkRadius(radiusOverL: number): void {
  if (!(radiusOverL > 0))
    throw new NumericalError('MODEL_INVALID', `The radius of the disc is ${radiusOverL} scales. Give a positive distance.`, { details: { radiusOverL } });
}
