/**
 * The boundary effect in an infinite wedge with natural sides, exactly: images plus the diffraction integral of the
 * wedge's Green's function on the surface of period 2 alpha (Carslaw 1920; Macdonald 1915). For m implicit steps
 * K_0(R)/(2 pi) becomes the Matérn function c(R) relative to the free variance.
 */

const INTEGRAL_STEP = 0.05;

/** Nearer than this to a shadow boundary the integrand's pole is not resolved, radians. */
const SHADOW_MARGIN = 0.12;

/**
 * Relative excess of the variance at polar coordinates (rho, phi) of a wedge of interior angle `alpha`, 0 <= phi <=
 * alpha; `image(x)` is c(2x). Near shadow boundaries, where images and integral jump against each other but their sum
 * is smooth, the mean of both sides is taken.
 */
export function wedgeExcess(image: (x: number) => number, alpha: number, rho: number, phi: number): number {
  // alpha = pi / n: the images alone are exact, the one at the vertex counted once
  const n = Math.round(Math.PI / alpha);
  if (Math.abs(n * alpha - Math.PI) < 1e-9) {
    let images = 0;
    for (let k = 0; k < n; k++) images += image(rho * Math.abs(Math.sin(phi + k * alpha))) + (k > 0 ? image(rho * Math.abs(Math.sin(k * alpha))) : 0);
    return images;
  }
  return awayFromShadow(image, alpha, rho, phi);
}

function awayFromShadow(image: (x: number) => number, alpha: number, rho: number, phi: number): number {
  const period = 2 * alpha;
  const offset = (target: number) => {
    const turns = (2 * phi - target) / period;
    return Math.abs(turns - Math.round(turns)) * period;
  };
  if (Math.min(offset(Math.PI), offset(-Math.PI)) < SHADOW_MARGIN) {
    // the images in the two sides vary fast and are kept out of the mean
    const sides = (at: number) => image(rho * Math.abs(Math.sin(at))) + image(rho * Math.abs(Math.sin(alpha - at)));
    const rest = (at: number) => imagesAndIntegral(image, alpha, rho, at) - sides(at);
    return sides(phi) + (rest(phi - SHADOW_MARGIN) + rest(phi + SHADOW_MARGIN)) / 2;
  }
  return imagesAndIntegral(image, alpha, rho, phi);
}

function imagesAndIntegral(image: (x: number) => number, alpha: number, rho: number, phi: number): number {
  const angles = [0, 2 * phi];
  const period = 2 * alpha;
  let images = 0;
  for (const angle of angles)
    for (let k = -Math.ceil(8 / period); k <= Math.ceil(8 / period); k++) {
      const a = Math.abs(angle + k * period);
      if (a < Math.PI && (angle !== 0 || k !== 0)) images += image(rho * Math.sin(a / 2));
    }
  const cosine = Math.cos((Math.PI * Math.PI) / alpha);
  let integral = 0;
  for (let y = INTEGRAL_STEP / 2; y < 12; y += INTEGRAL_STEP) {
    const weight = image(rho * Math.cosh(y / 2));
    const hyperbolic = Math.cosh((Math.PI * y) / alpha);
    if (weight === 0 || hyperbolic > 1e12) break;
    for (const angle of angles) {
      const turn = (Math.PI * angle) / alpha;
      const real = cosine - Math.cos(turn) * hyperbolic;
      const imaginary = Math.sin(turn) * Math.sinh((Math.PI * y) / alpha);
      integral += (weight * real) / (real * real + imaginary * imaginary);
    }
  }
  return images + (Math.sin((Math.PI * Math.PI) / alpha) / alpha) * integral * INTEGRAL_STEP;
}
