/**
 * Elementary functions with the same bits on every machine. The language leaves the accuracy of Math.sin and its
 * kin to the platform; these use only + - * / and sqrt, which IEEE 754 rounds exactly, on Taylor series after
 * reducing the argument (Cody & Waite 1980, Software Manual for the Elementary Functions). Relative errors stay
 * within a few units in the last place.
 */

export const PI = 3.141592653589793;
const HALF_PI = 1.5707963267948966;
/** pi/2 in three parts, the first two with trailing zeros, so that k times a part is exact for |k| < 2^20. */
const HALF_PI_HIGH = 1.5707963267341256;
const HALF_PI_MIDDLE = 6.077100506303966e-11;
const HALF_PI_LOW = 2.0222662487959506e-21;
const LN2_HIGH = 0.6931471803691238;
const LN2_LOW = 1.9082149292705877e-10;

const DEGREE = PI / 180;

/** Degrees to radians. */
export const radians = (degrees: number): number => degrees * DEGREE;
/** Radians to degrees. */
export const degrees = (angle: number): number => angle / DEGREE;

const sinKernel = (x: number): number => {
  const z = x * x;
  // x - x³/3! + ... to x^17, nested so that small terms come first
  let s = 1 - z / 272;
  s = 1 - (z / 210) * s;
  s = 1 - (z / 156) * s;
  s = 1 - (z / 110) * s;
  s = 1 - (z / 72) * s;
  s = 1 - (z / 42) * s;
  s = 1 - (z / 20) * s;
  return x - x * (z / 6) * s;
};

const cosKernel = (x: number): number => {
  const z = x * x;
  let c = 1 - z / 306;
  c = 1 - (z / 240) * c;
  c = 1 - (z / 182) * c;
  c = 1 - (z / 132) * c;
  c = 1 - (z / 90) * c;
  c = 1 - (z / 56) * c;
  c = 1 - (z / 30) * c;
  const half = 0.5 * z;
  const w = 1 - half;
  return w + (1 - w - half + (z * z / 24) * c);
};

/** Quadrant of x and the rest in [-pi/4, pi/4]; good for |x| up to 2^20. */
const reduce = (x: number): [number, number] => {
  const k = Math.round(x / HALF_PI);
  return [k, x - k * HALF_PI_HIGH - k * HALF_PI_MIDDLE - k * HALF_PI_LOW];
};

const sinQuadrant = (k: number, r: number): number => {
  const quadrant = ((k % 4) + 4) % 4;
  if (quadrant === 0) return sinKernel(r);
  if (quadrant === 1) return cosKernel(r);
  return quadrant === 2 ? -sinKernel(r) : -cosKernel(r);
};

/** Sine of x radians, |x| < 2^20. */
export const sin = (x: number): number => {
  if (x < 0.785 && x > -0.785) return sinKernel(x);
  const [k, r] = reduce(x);
  return sinQuadrant(k, r);
};

/** Cosine of x radians, |x| < 2^20. */
export const cos = (x: number): number => {
  if (x < 0.785 && x > -0.785) return cosKernel(x);
  const [k, r] = reduce(x);
  return sinQuadrant(k + 1, r);
};

/** Tangent of x radians, |x| < 2^20. */
export const tan = (x: number): number => sin(x) / cos(x);

/** Sine of an angle in degrees: exact at multiples of 90. */
export const sinDegrees = (x: number): number => {
  const k = Math.round(x / 90);
  return sinQuadrant(k, (x - 90 * k) * DEGREE);
};

/** Cosine of an angle in degrees: exact zeros at odd multiples of 90. */
export const cosDegrees = (x: number): number => {
  const k = Math.round(x / 90);
  return sinQuadrant(k + 1, (x - 90 * k) * DEGREE);
};

/** atan(k/8), k = 0..8. */
const ATAN_EIGHTHS = [
  0, 0.12435499454676144, 0.24497866312686414, 0.3587706702705722, 0.4636476090008061, 0.5585993153435624,
  0.6435011087932844, 0.7188299996216245, 0.7853981633974483,
];

/** Arctangent of t, 0 <= t <= 1: the nearest eighth by table, the rest (below 1/16) by series. */
const atanUnit = (t: number): number => {
  const k = Math.round(8 * t);
  const c = k / 8;
  const u = (t - c) / (1 + t * c);
  const z = u * u;
  let s = 1 / 13 - z / 15;
  s = 1 / 11 - z * s;
  s = 1 / 9 - z * s;
  s = 1 / 7 - z * s;
  s = 1 / 5 - z * s;
  s = 1 / 3 - z * s;
  return ATAN_EIGHTHS[k] + (u - u * z * s);
};

/** Angle of the vector (x, y) in (-pi, pi]; 0 for the zero vector. */
export const atan2 = (y: number, x: number): number => {
  const ax = Math.abs(x);
  const ay = Math.abs(y);
  if (ax === 0 && ay === 0) return 0;
  let angle = ay <= ax ? atanUnit(ay / ax) : HALF_PI - atanUnit(ax / ay);
  if (x < 0) angle = PI - angle;
  return y < 0 ? -angle : angle;
};

/** Arctangent in (-pi/2, pi/2). */
export const atan = (x: number): number => atan2(x, 1);

/** Arcsine of x in [-1, 1]; NaN outside. */
export const asin = (x: number): number => (x > 1 || x < -1 ? NaN : atan2(x, Math.sqrt((1 - x) * (1 + x))));

/** Arccosine of x in [-1, 1]; NaN outside. */
export const acos = (x: number): number => (x > 1 || x < -1 ? NaN : atan2(Math.sqrt((1 - x) * (1 + x)), x));

/** sqrt(x² + y²) without overflow. */
export const hypot = (x: number, y: number): number => {
  const a = Math.abs(x);
  const b = Math.abs(y);
  const large = a > b ? a : b;
  if (large === 0 || large === Infinity) return large;
  if (large < 1e150 && large > 1e-140) return Math.sqrt(a * a + b * b);
  return large * Math.sqrt((a / large) * (a / large) + (b / large) * (b / large));
};

const POWER_BUFFER = new DataView(new ArrayBuffer(8));

/** 2^k for -1022 <= k <= 1023. */
const powerOfTwo = (k: number): number => {
  POWER_BUFFER.setUint32(0, (k + 1023) << 20);
  POWER_BUFFER.setUint32(4, 0);
  return POWER_BUFFER.getFloat64(0);
};

/** e^x; underflows to 0 and overflows to Infinity. */
export const exp = (x: number): number => {
  if (Number.isNaN(x)) return NaN;
  if (x > 709.782712893384) return Infinity;
  if (x < -745.2) return 0;
  const k = Math.round(x / 0.6931471805599453);
  const r = x - k * LN2_HIGH - k * LN2_LOW;
  let s = 1 + r / 14;
  for (let n = 13; n > 1; n--) s = 1 + (r / n) * s;
  const e = 1 + r * s;
  const half = Math.trunc(k / 2);
  return e * powerOfTwo(half) * powerOfTwo(k - half);
};

/** Natural logarithm; -Infinity at 0, NaN below. */
export const log = (x: number): number => {
  if (!(x >= 0)) return NaN;
  if (x === 0) return -Infinity;
  if (x === Infinity) return Infinity;
  let exponent = 0;
  let value = x;
  if (value < 2.2250738585072014e-308) {
    value *= 18014398509481984;
    exponent = -54;
  }
  POWER_BUFFER.setFloat64(0, value);
  const high = POWER_BUFFER.getUint32(0);
  exponent += (high >>> 20) - 1023;
  POWER_BUFFER.setUint32(0, (high & 0xfffff) | 0x3ff00000);
  let m = POWER_BUFFER.getFloat64(0);
  if (m > 1.4142135623730951) {
    m /= 2;
    exponent++;
  }
  // log m = 2 artanh((m-1)/(m+1))
  const f = m - 1;
  const s = f / (2 + f);
  const z = s * s;
  let series = 1 / 23;
  for (let n = 21; n >= 3; n -= 2) series = 1 / n + z * series;
  return exponent * LN2_HIGH + (2 * s + (2 * s * z * series + exponent * LN2_LOW));
};
