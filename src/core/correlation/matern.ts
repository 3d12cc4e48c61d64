/**
 * The Matérn correlation of integer order that m implicit diffusion steps give in the unbounded plane:
 * c(r) = 2^(1-nu)/Gamma(nu) (r/l)^nu K_nu(r/l), nu = m - 1. Whittle 1954; Matérn 1960; Guttorp & Gneiting 2006.
 */
import { NumericalError } from '#core/errors.ts';
import { besselK01 } from './bessel.ts';

/** c and its first two derivatives with respect to r/l. `second` is -Infinity at r = 0 for m = 2. */
export interface MaternValues {
  value: number;
  first: number;
  second: number;
}

/**
 * c(r) for m >= 2 steps at distance r = `rOverL` diffusion scales, rounding-level relative accuracy.
 * g_nu = x^nu K_nu / (2^(nu-1) Gamma(nu)) obeys g_(nu+1) = g_nu + x^2 g_(nu-1) / (4 nu (nu-1)): all terms positive.
 */
export function maternCorrelation(m: number, rOverL: number): number {
  checkSteps(m);
  return maternSeries(m - 1, rOverL).current;
}

/** c, dc/d(r/l) and d2c/d(r/l)2 for m >= 2 steps. */
export function maternDerivatives(m: number, rOverL: number): MaternValues {
  checkSteps(m);
  const nu = m - 1;
  const x = rOverL;
  if (x === 0) return { value: 1, first: 0, second: nu === 1 ? -Infinity : -1 / (2 * nu - 2) };
  if (nu === 1) {
    const { k0, k1 } = besselK01(x);
    return { value: x * k1, first: -x * k0, second: x * k1 - k0 };
  }
  // d/dx (x^nu K_nu) = -x^nu K_(nu-1), so c' = -x g_(nu-1) / (2 nu - 2)
  const { current, previous, beforePrevious } = maternSeries(nu, x);
  const second = nu === 2
    ? -(previous - x * x * besselK01(x).k0) / 2
    : -(previous - (x * x * beforePrevious) / (2 * nu - 4)) / (2 * nu - 2);
  return { value: current, first: (-x * previous) / (2 * nu - 2), second };
}

function maternSeries(nu: number, x: number): { current: number; previous: number; beforePrevious: number } {
  if (x === 0) return { current: 1, previous: 1, beforePrevious: 1 };
  const { k0, k1 } = besselK01(x);
  let beforePrevious = NaN;
  let previous = k0;
  let current = x * k1;
  for (let n = 1; n < nu; n++) {
    const next = n === 1 ? current + (x * x * k0) / 2 : current + (x * x * previous) / (4 * n * (n - 1));
    beforePrevious = previous;
    previous = current;
    current = next;
  }
  return { current, previous, beforePrevious };
}

function checkSteps(m: number): void {
  if (!Number.isInteger(m) || m < 2 || m > 100)
    throw new NumericalError('MODEL_INVALID', `The number of implicit steps is ${m}. Give a whole number from 2 to 20.`, { details: { steps: m } });
}
