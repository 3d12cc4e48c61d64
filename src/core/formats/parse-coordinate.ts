import { explainNumber, parseNumber } from './parse-number.ts';

export type Axis = 'longitude' | 'latitude';

const HEMISPHERES: Record<Axis, string> = { longitude: 'EW', latitude: 'NS' };
const LIMITS: Record<Axis, [number, number]> = { longitude: [-180, 360], latitude: [-90, 90] };

interface Sexagesimal {
  prefix: string;
  sign: string;
  /** Degrees, minutes, seconds: the parts that were given. */
  parts: number[];
  /** Whether only the last part, if any, has a fraction. */
  isFractionLast: boolean;
  suffix: string;
}

/** A sign or letter round the digits and their marks. */
const FRAME = /^([NSEW]?)\s*([+-]?)([\d.\s°º:'"′″]+)([NSEW]?)$/i;
/** The digits' frame with # for each number: degrees, then minutes and seconds where given. */
const SHAPE = /^ ?# ?(?:[°º:]? ?(?:# ?(?:['′:]? ?(?:# ?["″]?)?)?)?)? ?$/;
const LONGEST = 60;

const tidy = (text: string, decimalComma: boolean): string => {
  const marked = text.replace(/[’‘´`]/g, "'").replace(/''|”|“/g, '"').replace(/\u2212/g, '-').trim();
  return decimalComma ? marked.replace(/(\d),(\d)/g, '$1.$2') : marked;
};

const matchSexagesimal = (text: string): Sexagesimal | null => {
  const frame = text.length <= LONGEST ? FRAME.exec(text) : null;
  if (!frame) return null;
  const shape = frame[3].replace(/[\d.]+/g, '#').replace(/\s+/g, ' ');
  const parts = frame[3].match(/[\d.]+/g) ?? [];
  // three digits are no minutes: "1 000" is a number with a thousands separator
  const isPart = (part: string, k: number): boolean => (k === 0 ? /^\d+\.?\d*$/ : /^\d{1,2}(\.\d*)?$/).test(part);
  if (!SHAPE.test(shape) || shape.trimEnd().endsWith(':') || !parts.every(isPart)) return null;
  return {
    prefix: frame[1].toUpperCase(),
    sign: frame[2],
    parts: parts.map(Number),
    isFractionLast: parts.slice(0, -1).every((part) => !part.includes('.')),
    suffix: frame[4].toUpperCase(),
  };
};

/**
 * A coordinate in degrees: decimal, or sexagesimal such as 12°30'45.5"S, 12 30 45.5 S, S12:30:45.5 or -12:30, with a
 * letter before or after, or a sign. Longitudes are given in [-180, 180). NaN for anything else.
 */
export const parseCoordinate = (text: string, axis: Axis, decimalComma = false): number => {
  const decimal = parseNumber(text, decimalComma);
  return Number.isNaN(decimal) ? readSexagesimal(tidy(text, decimalComma), axis) : placeDegrees(decimal, axis);
};

const readSexagesimal = (text: string, axis: Axis): number => {
  const found = matchSexagesimal(text);
  if (!found || problemOf(found, axis)) return NaN;
  const [degrees, minutes = 0, seconds = 0] = found.parts;
  const size = (degrees * 3600 + minutes * 60 + seconds) / 3600;
  const isNegative = found.sign === '-' || 'SW'.includes(found.prefix + found.suffix || '?');
  return placeDegrees(isNegative ? -size : size, axis);
};

/** The degrees themselves, a longitude brought into [-180, 180); NaN outside the axis' limits. */
export const placeDegrees = (degrees: number, axis: Axis): number => {
  const [least, most] = LIMITS[axis];
  if (!(degrees >= least && degrees <= most)) return NaN;
  return axis === 'longitude' && degrees >= 180 ? degrees - 360 : degrees + 0;
};

const problemOf = ({ prefix, sign, parts, isFractionLast, suffix }: Sexagesimal, axis: Axis): string | null => {
  const letter = prefix + suffix;
  if (letter.length > 1) return 'There is a letter before and one after. Keep one of them.';
  if (letter && sign) return 'There is a sign and a letter. Keep one of them.';
  if (letter && !HEMISPHERES[axis].includes(letter))
    return `The letter ${letter} belongs to a ${axis === 'latitude' ? 'longitude' : 'latitude'}. Map the columns the other way round.`;
  if (!isFractionLast) return 'Only the last of degrees, minutes and seconds may have a fraction.';
  if (parts.slice(1).some((part) => part >= 60)) return 'Minutes and seconds must be below 60.';
  return null;
};

const OUTSIDE: Record<Axis, string> = {
  longitude: 'A longitude lies between -180 and 360 degrees. If these are projected coordinates, map them as x and y.',
  latitude:
    'A latitude lies between -90 and 90 degrees. If the columns are exchanged or the coordinates projected, change the mapping.',
};

/** Why `parseCoordinate` gave NaN, and what to write instead. */
export const explainCoordinate = (text: string, axis: Axis, decimalComma: boolean): string => {
  if (!Number.isNaN(parseNumber(text, decimalComma))) return OUTSIDE[axis];
  const found = matchSexagesimal(tidy(text, decimalComma));
  if (found) return problemOf(found, axis) ?? OUTSIDE[axis];
  if (/\d\D+\d/.test(text) && /[°'":NSEW]/i.test(text))
    return `This is not a ${axis}. Write decimal degrees, or degrees, minutes and seconds such as 12°30'45.5"${HEMISPHERES[axis][1]}.`;
  return explainNumber(text, decimalComma);
};
