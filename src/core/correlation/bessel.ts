/**
 * Modified Bessel functions of integer order for positive real arguments, to full double precision (relative).
 * Power series: NIST DLMF 10.25.2, 10.31.1-2. Integral: DLMF 10.32.9, by the trapezoidal rule, which converges
 * exponentially here (Trefethen & Weideman 2014). Asymptotic series: DLMF 10.40.2.
 */

const EULER_GAMMA = 0.5772156649015329;
const TRAPEZOID_STEP = 0.125;
const TRAPEZOID_NODES = 36;

// 2 sinh^2(t/2) = cosh t - 1, without cancellation
const coshMinusOne = Float64Array.from({ length: TRAPEZOID_NODES }, (_, k) => {
  const s = Math.sinh((k * TRAPEZOID_STEP) / 2);
  return 2 * s * s;
});

/** K_0(x) and K_1(x), each times e^x, for x > 0. */
export function besselK01Scaled(x: number): { k0: number; k1: number } {
  if (x <= 1) {
    const { k0, k1 } = smallArgument(x);
    const e = Math.exp(x);
    return { k0: k0 * e, k1: k1 * e };
  }
  if (x > 20) return { k0: asymptoticK(0, x), k1: asymptoticK(1, x) };
  // K_n(x) e^x = integral of exp(-x (cosh t - 1)) cosh(n t) over t > 0
  let k0 = 0.5;
  let k1 = 0.5;
  for (let k = 1; k < TRAPEZOID_NODES; k++) {
    const w = coshMinusOne[k];
    const f = Math.exp(-x * w);
    k0 += f;
    k1 += f * (1 + w);
    if (f * (1 + w) < 1e-18) break;
  }
  return { k0: k0 * TRAPEZOID_STEP, k1: k1 * TRAPEZOID_STEP };
}

/** K_0(x) and K_1(x) for x > 0; both underflow to 0 beyond x of about 740. */
export function besselK01(x: number): { k0: number; k1: number } {
  if (x <= 1) return smallArgument(x);
  const { k0, k1 } = besselK01Scaled(x);
  const e = Math.exp(-x);
  return { k0: k0 * e, k1: k1 * e };
}

function smallArgument(x: number): { k0: number; k1: number } {
  const q = (x * x) / 4;
  const logTerm = Math.log(x / 2) + EULER_GAMMA;
  let harmonic = 0;
  let term0 = 1; // q^k / k!^2
  let term1 = 1; // q^k / (k! (k+1)!)
  let k0 = -logTerm;
  let k1 = logTerm - 0.5;
  for (let k = 1; k < 30; k++) {
    harmonic += 1 / k;
    term0 *= q / (k * k);
    term1 *= q / (k * (k + 1));
    k0 += term0 * (harmonic - logTerm);
    k1 += term1 * (logTerm - harmonic - 0.5 / (k + 1));
    if (term0 < 1e-18) break;
  }
  return { k0, k1: 1 / x + (x / 2) * k1 };
}

function asymptoticK(order: number, x: number): number {
  let term = 1;
  let sum = 1;
  for (let k = 1; k < 60; k++) {
    const odd = 2 * k - 1;
    const next = (term * (4 * order * order - odd * odd)) / (8 * k * x);
    if (Math.abs(next) >= Math.abs(term)) break;
    term = next;
    sum += term;
    if (Math.abs(term) < 1e-17) break;
  }
  return Math.sqrt(Math.PI / (2 * x)) * sum;
}

/** K_0 .. K_maxOrder at x > 0, by upward recurrence (stable for K, DLMF 10.29.1). */
export function besselKOrders(maxOrder: number, x: number): Float64Array {
  const { k0, k1 } = besselK01(x);
  const k = new Float64Array(Math.max(2, maxOrder + 1));
  k[0] = k0;
  k[1] = k1;
  for (let n = 1; n < maxOrder; n++) k[n + 1] = k[n - 1] + ((2 * n) / x) * k[n];
  return k;
}

/** I_n(x) for integer n >= 0 and 0 <= x <= 700: every term of the series is positive, so nothing cancels. */
export function besselI(n: number, x: number): number {
  const q = (x * x) / 4;
  let term = 1;
  for (let k = 1; k <= n; k++) term *= x / (2 * k);
  let sum = term;
  for (let k = 1; term > sum * 1e-18 || k * (n + k) < q; k++) {
    term *= q / (k * (n + k));
    sum += term;
  }
  return sum;
}
