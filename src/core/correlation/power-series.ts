/**
 * Truncated Taylor series in s about s = 1 of the Bessel functions of z = sqrt(s) x, from
 * (1/z d/dz)^k (z^n K_n) = (-1)^k z^(n-k) K_(n-k), (1/z d/dz)^k (z^n I_n) = z^(n-k) I_(n-k) (DLMF 10.29.4), 2/x^2 d/ds = 1/z d/dz.
 */
import { besselI, besselKOrders } from './bessel.ts';

/** Coefficients of (s - 1)^0 .. (s - 1)^(count - 1). */
export type Series = Float64Array;

/** z^n K_n(z), n = 0 or 1, z = sqrt(s) x. The signs alternate. */
export function seriesK(n: 0 | 1, x: number, count: number): Series {
  const k = besselKOrders(count, x);
  return Float64Array.from({ length: count }, (_, j) => scaled(-x / 2, j) * x ** n * k[Math.abs(n - j)]);
}

/** z^n I_n(z), n = 0 or 1, z = sqrt(s) x. All positive. */
export function seriesI(n: 0 | 1, x: number, count: number): Series {
  return Float64Array.from({ length: count }, (_, j) => scaled(x / 2, j) * x ** n * besselI(Math.abs(n - j), x));
}

/** t^j / j! */
function scaled(t: number, j: number): number {
  let value = 1;
  for (let k = 1; k <= j; k++) value *= t / k;
  return value;
}

export function multiplySeries(a: Series, b: Series): Series {
  const out = new Float64Array(a.length);
  for (let i = 0; i < a.length; i++) for (let j = 0; i + j < a.length; j++) out[i + j] += a[i] * b[j];
  return out;
}

/** a / b, for b[0] != 0. */
export function divideSeries(a: Series, b: Series): Series {
  const out = new Float64Array(a.length);
  for (let i = 0; i < a.length; i++) {
    let sum = a[i];
    for (let j = 1; j <= i; j++) sum -= b[j] * out[i - j];
    out[i] = sum / b[0];
  }
  return out;
}

/** s a(s). */
export function timesS(a: Series): Series {
  return a.map((value, i) => value + (i > 0 ? a[i - 1] : 0));
}

/**
 * The relative change of the m-step variance that belongs to a change E(s) of the diagonal of (s - Laplacian)^-1:
 * 4 pi (m-1) (-1)^(m-1)/(m-1)! E^(m-1)(1), lengths in l; `series` holds m coefficients.
 */
export function relativeVariance(m: number, series: Series): number {
  return 4 * Math.PI * (m - 1) * (m % 2 === 0 ? -1 : 1) * series[m - 1];
}
