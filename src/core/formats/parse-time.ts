import { parseNumber } from './parse-number.ts';

const CALENDAR = /^(\d{4})-?(\d{2})-?(\d{2})(?:[T ](\d{2})(?::?(\d{2})(?::?(\d{2})(?:[.,](\d{1,9}))?)?)?\s*(Z|UTC|[+-]\d{2}(?::?\d{2})?)?)?$/i;

/** 0001-01-01 and the end of 9999 in Unix seconds. */
const EARLIEST = -62_135_596_800;
const LATEST = 253_402_300_800;

const DAYS_BEFORE_MONTH = [0, 31, 59, 90, 120, 151, 181, 212, 243, 273, 304, 334];
const isLeapYear = (year: number): boolean => (year % 4 === 0 && year % 100 !== 0) || year % 400 === 0;
const DAYS_IN_MONTH = [31, 28, 31, 30, 31, 30, 31, 31, 30, 31, 30, 31];
const daysInMonth = (year: number, month: number): number =>
  month === 2 && isLeapYear(year) ? 29 : DAYS_IN_MONTH[month - 1];

/** Days from 1970-01-01 to a day of the proleptic Gregorian calendar. */
const dayNumber = (year: number, month: number, day: number): number => {
  const before = year - 1;
  const leapDays = Math.floor(before / 4) - Math.floor(before / 100) + Math.floor(before / 400);
  const dayOfYear = DAYS_BEFORE_MONTH[month - 1] + (month > 2 && isLeapYear(year) ? 1 : 0) + day - 1;
  return before * 365 + leapDays + dayOfYear - 719_162;
};

/**
 * Seconds since 1970-01-01T00:00:00Z of an ISO 8601 date, date and time (extended or basic form, a space for the T
 * allowed, UTC where no zone is given), or of a number of Unix seconds. Eight digits are a date. NaN for anything else.
 */
export const parseTime = (text: string): number => {
  const parts = CALENDAR.exec(text);
  if (parts) return calendarSeconds(parts);
  const seconds = parseNumber(text);
  return seconds >= EARLIEST && seconds < LATEST ? seconds : NaN;
};

/** The same of bytes, by a short way for whole seconds with a Z or without a zone: 2026-12-31T23:59:59Z. */
export const parseTimeBytes = (bytes: Uint8Array, start: number, end: number, text: () => string): number => {
  const length = end - start;
  const isPlain =
    (length === 19 || (length === 20 && bytes[end - 1] === 0x5a)) &&
    bytes[start + 4] === 0x2d &&
    bytes[start + 7] === 0x2d &&
    (bytes[start + 10] === 0x54 || bytes[start + 10] === 0x20) &&
    bytes[start + 13] === 0x3a &&
    bytes[start + 16] === 0x3a;
  if (!isPlain) return parseTime(text());
  const century = twoDigits(bytes, start);
  const year = century * 100 + twoDigits(bytes, start + 2);
  const month = twoDigits(bytes, start + 5);
  const day = twoDigits(bytes, start + 8);
  const hour = twoDigits(bytes, start + 11);
  const minute = twoDigits(bytes, start + 14);
  const second = twoDigits(bytes, start + 17);
  if (Number.isNaN(year + month + day + hour + minute + second)) return NaN;
  return secondsOf(year, month, day, hour, minute, second);
};

const twoDigits = (bytes: Uint8Array, at: number): number => {
  const tens = bytes[at] - 0x30;
  const ones = bytes[at + 1] - 0x30;
  return tens >= 0 && tens <= 9 && ones >= 0 && ones <= 9 ? tens * 10 + ones : NaN;
};

const secondsOf = (year: number, month: number, day: number, hour: number, minute: number, second: number): number => {
  if (year < 1 || month < 1 || month > 12 || day < 1 || day > daysInMonth(year, month)) return NaN;
  const isLeapSecond = minute === 59 && second === 60;
  if (hour > 23 || minute > 59 || (second > 59 && !isLeapSecond)) return NaN;
  return dayNumber(year, month, day) * 86_400 + hour * 3600 + minute * 60 + second;
};

const calendarSeconds = (parts: RegExpExecArray): number => {
  const [year, month, day, hour, minute, second] = parts.slice(1, 7).map((part) => Number(part ?? 0));
  const fraction = parts[7] ? Number(`0.${parts[7]}`) : 0;
  return secondsOf(year, month, day, hour, minute, second) - zoneSeconds(parts[8]) + fraction;
};

const zoneSeconds = (zone: string | undefined): number => {
  if (!zone || /^(Z|UTC)$/i.test(zone)) return 0;
  const digits = zone.slice(1).replace(':', '');
  const hours = Number(digits.slice(0, 2));
  const minutes = Number(digits.slice(2) || 0);
  if (hours > 23 || minutes > 59) return NaN;
  return (zone[0] === '-' ? -1 : 1) * (hours * 3600 + minutes * 60);
};

/** Why `parseTime` gave NaN, and what to write instead. */
export const explainTime = (text: string): string => {
  if (CALENDAR.test(text)) return 'There is no such date or time. Check month, day, hours, minutes, seconds and zone.';
  if (parseNumber(text) >= LATEST && parseNumber(text) < LATEST * 1000)
    return 'Read as Unix seconds this lies after the year 9999. If these are milliseconds, divide them by 1000.';
  if (/^\d{1,2}[./-]\d{1,2}[./-]\d{2,4}/.test(text))
    return 'Day and month cannot be told apart here. Write the date as 2026-12-31, with the time as 2026-12-31T23:59:59Z.';
  return 'This is not a time. Write ISO 8601 such as 2026-12-31T23:59:59Z, or Unix seconds.';
};
