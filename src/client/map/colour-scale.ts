type Rgb = [number, number, number];

const toLinear = (c: number): number => (c <= 0.04045 ? c / 12.92 : ((c + 0.055) / 1.055) ** 2.4);
const toGamma = (c: number): number => (c <= 0.0031308 ? 12.92 * c : 1.055 * c ** (1 / 2.4) - 0.055);

/** sRGB in 0..1 to OKLab (Ottosson 2020, "A perceptual color space for image processing"). */
const toOklab = ([r, g, b]: Rgb): Rgb => {
  const [lr, lg, lb] = [toLinear(r), toLinear(g), toLinear(b)];
  const l = Math.cbrt(0.4122214708 * lr + 0.5363325363 * lg + 0.0514459929 * lb);
  const m = Math.cbrt(0.2119034982 * lr + 0.6806995451 * lg + 0.1073969566 * lb);
  const s = Math.cbrt(0.0883024619 * lr + 0.2817188376 * lg + 0.6299787005 * lb);
  return [
    0.2104542553 * l + 0.793617785 * m - 0.0040720468 * s,
    1.9779984951 * l - 2.428592205 * m + 0.4505937099 * s,
    0.0259040371 * l + 0.7827717662 * m - 0.808675766 * s,
  ];
};

const fromOklab = ([L, a, b]: Rgb): Rgb => {
  const l = (L + 0.3963377774 * a + 0.2158037573 * b) ** 3;
  const m = (L - 0.1055613458 * a - 0.0638541728 * b) ** 3;
  const s = (L - 0.0894841775 * a - 1.291485548 * b) ** 3;
  const clamp = (c: number): number => Math.min(1, Math.max(0, toGamma(c)));
  return [
    clamp(4.0767416621 * l - 3.3077115913 * m + 0.2309699292 * s),
    clamp(-1.2684380046 * l + 2.6097574011 * m - 0.3413193965 * s),
    clamp(-0.0041960863 * l - 0.7034186147 * m + 1.707614701 * s),
  ];
};

export const SCALE_STEPS = 64;

/**
 * A sequential scale through the given colours, `SCALE_STEPS` times red, green, blue, alpha in 0..255, its steps equally far
 * apart in OKLab. With colours of rising or falling lightness it reads without colour vision.
 */
export const createColourScale = (colours: Rgb[]): Uint8Array => {
  const stops = colours.map(toOklab);
  const lengths = stops.slice(1).map((stop, k) => Math.hypot(stop[0] - stops[k][0], stop[1] - stops[k][1], stop[2] - stops[k][2]));
  const total = lengths.reduce((sum, length) => sum + length, 0);
  const bytes = new Uint8Array(4 * SCALE_STEPS);
  for (let step = 0; step < SCALE_STEPS; step++) {
    let at = (total * step) / (SCALE_STEPS - 1);
    let k = 0;
    while (k < lengths.length - 1 && at > lengths[k]) at -= lengths[k++];
    const t = Math.min(1, at / lengths[k]);
    const [from, to] = [stops[k], stops[k + 1]];
    const rgb = fromOklab([0, 1, 2].map((c) => from[c] + (to[c] - from[c]) * t) as Rgb);
    for (let c = 0; c < 3; c++) bytes[4 * step + c] = Math.round(255 * rgb[c]);
    bytes[4 * step + 3] = 255;
  }
  return bytes;
};

/** Lightness in OKLab of a colour in 0..1. */
export const lightness = (rgb: Rgb): number => toOklab(rgb)[0];

/** The scale as a CSS gradient for a legend. */
export const scaleGradient = (scale: Uint8Array): string => {
  const stops: string[] = [];
  for (let k = 0; k < SCALE_STEPS; k += 7) stops.push(`rgb(${scale[4 * k]} ${scale[4 * k + 1]} ${scale[4 * k + 2]})`);
  return `linear-gradient(to right, ${stops.join(', ')})`;
};

/** `#rrggbb` to red, green, blue in 0..1; black for anything else. */
export const readHex = (text: string): Rgb => {
  const match = /^#([0-9a-f]{2})([0-9a-f]{2})([0-9a-f]{2})$/i.exec(text.trim());
  return match ? (match.slice(1).map((part) => Number.parseInt(part, 16) / 255) as Rgb) : [0, 0, 0];
};
