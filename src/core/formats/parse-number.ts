/** Powers of ten that a double holds exactly. */
const POWERS = Array.from({ length: 23 }, (_, k) => Number(`1e${k}`));
const LARGEST_EXACT = 2 ** 53;

const NUMBER = /^[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?$/;

/**
 * A decimal number, correctly rounded; NaN for anything else, infinities, hexadecimal and "NaN" included.
 * The Unicode minus sign (U+2212) counts as a minus.
 */
export const parseNumber = (text: string, decimalComma = false): number => {
  const plain = text.charCodeAt(0) === 0x2212 ? `-${text.slice(1)}` : text;
  const pointed = decimalComma ? swapComma(plain) : plain;
  if (!NUMBER.test(pointed)) return NaN;
  const value = Number(pointed);
  return Number.isFinite(value) ? value : NaN;
};

/** A point for the comma, and the other way round, so that a point in a decimal-comma file is no number. */
const swapComma = (text: string): string => text.replace(/[.,]/g, (mark) => (mark === ',' ? '.' : ','));

/**
 * `parseNumber` of the bytes from `start` to `end`. Up to 15 digits and an exponent within ±22 take Clinger's exact
 * fast path (Clinger 1990, How to read floating point numbers accurately); the rest goes the long way.
 */
export const parseNumberBytes = (bytes: Uint8Array, start: number, end: number, decimalComma: boolean): number => {
  const mark = decimalComma ? 0x2c : 0x2e;
  let at = start;
  const isNegative = bytes[at] === 0x2d;
  if (isNegative || bytes[at] === 0x2b) at++;
  let mantissa = 0;
  let digits = 0;
  let fraction = 0;
  let isAfterMark = false;
  for (; at < end; at++) {
    const digit = bytes[at] - 0x30;
    if (digit >= 0 && digit <= 9) {
      mantissa = mantissa * 10 + digit;
      digits++;
      if (isAfterMark) fraction++;
    } else if (bytes[at] === mark && !isAfterMark) isAfterMark = true;
    else break;
  }
  const isPlain = at === end && digits > 0 && digits <= 18 && mantissa <= LARGEST_EXACT && fraction <= 22;
  if (!isPlain) return parseNumber(latin1(bytes, start, end), decimalComma);
  const value = mantissa / POWERS[fraction];
  return isNegative ? -value : value;
};

const latin1 = (bytes: Uint8Array, start: number, end: number): string => {
  // longer than any number worth reading
  if (end - start > 400) return '';
  let text = '';
  for (let i = start; i < end; i++) text += String.fromCharCode(bytes[i]);
  return text === '' || bytes[start] !== 0xe2 ? text : text.replace('\u00e2\u0088\u0092', '\u2212');
};

/** Why `parseNumber` gave NaN, and what to write instead. */
export const explainNumber = (text: string, decimalComma: boolean): string => {
  if (/^[+-]?(nan|na|n\/a|null|none|missing|-+|\.+)$/i.test(text))
    return 'This is not a number. Leave the cell empty where there is no value.';
  if (/^[+-]?inf(inity)?$/i.test(text)) return 'An infinite value cannot be used. Give a finite number, or leave the cell empty.';
  if (/^0x/i.test(text)) return 'Hexadecimal numbers are not read. Write the number in decimal digits.';
  if (!Number.isNaN(parseNumber(text, !decimalComma)))
    return decimalComma
      ? 'The file uses a decimal comma, but this number has a decimal point. Write all numbers in one way.'
      : 'This number has a decimal comma. Use a decimal point, or separate columns by semicolons and choose decimal comma.';
  if (NUMBER.test(text)) return 'This number is too large to be held. Check its exponent.';
  if (/^[+-]?\d{1,3}([ '.,\u00a0\u202f]\d{3})+([.,]\d+)?$/.test(text))
    return 'This number has thousands separators. Write it without them.';
  return 'This is text where a number is needed. Correct it, or map another column.';
};
