import fc from 'fast-check';
import { describe, expect, it } from 'vitest';

import { explainCoordinate, parseCoordinate } from '#core/formats/parse-coordinate.ts';
import { explainNumber, parseNumber, parseNumberBytes } from '#core/formats/parse-number.ts';
import { explainTime, parseTime, parseTimeBytes } from '#core/formats/parse-time.ts';

import { utf8 } from './sample-file.ts';

const throughBytes = (text: string, decimalComma = false): number => {
  const bytes = utf8(`;${text};`);
  return parseNumberBytes(bytes, 1, bytes.length - 1, decimalComma);
};

describe('parseNumber', () => {
  it('rounds as the language does, from text and from bytes', () => {
    const digits = fc.string({ unit: fc.constantFrom(...'0123456789'), minLength: 1, maxLength: 25 });
    const decimal = fc.tuple(fc.constantFrom('', '-', '+'), digits, fc.constantFrom('', '.'), fc.option(digits, { nil: '' }), fc.constantFrom('', 'e5', 'E-7', 'e-300'));
    fc.assert(
      fc.property(fc.oneof(decimal.map(([sign, a, point, b, e]) => sign + a + point + (point && b) + e), fc.double({ noNaN: true, noDefaultInfinity: true }).map(String)), (text) => {
        expect(parseNumber(text)).toBe(Number(text));
        expect(throughBytes(text)).toBe(Number(text));
        expect(throughBytes(text.replace('.', ','), true)).toBe(Number(text));
      }),
      { numRuns: 2000 },
    );
  });

  it('takes the Unicode minus sign', () => {
    expect(parseNumber('\u22121.5')).toBe(-1.5);
    expect(throughBytes('\u22121.5')).toBe(-1.5);
  });

  it.each(['', '.', '-', 'e5', '1e', '1.2.3', '1,5', 'NaN', 'Infinity', '-inf', '0x10', '1_000', '1 000', '١', '1e999', '--1', '1-'])(
    'gives NaN and a reason for "%s"',
    (text) => {
      expect(parseNumber(text)).toBeNaN();
      expect(throughBytes(text)).toBeNaN();
      expect(explainNumber(text, false)).toMatch(/\.$/);
    },
  );
});

describe('parseCoordinate', () => {
  const ways = (d: number, m: number, s: number, letter: string, sign: string): string[] => [
    `${d}°${m}'${s}"${letter}`,
    `${d}° ${m}' ${s}" ${letter}`,
    `${letter}${d}°${m}′${s}″`,
    `${letter} ${d}:${m}:${s}`,
    `${d}:${m}:${s}${letter.toLowerCase()}`,
    `${sign}${d} ${m} ${s}`,
    `${d} ${m} ${s} ${letter}`,
    `${d}º${m}’${s}”${letter}`,
    `${d}°${m}'${s}''${letter}`,
  ];

  it('agrees with degrees + minutes/60 + seconds/3600 for every way of writing', () => {
    const angle = fc.tuple(fc.integer({ min: 0, max: 89 }), fc.integer({ min: 0, max: 59 }), fc.integer({ min: 0, max: 5999 }), fc.boolean());
    fc.assert(
      fc.property(angle, fc.constantFrom('longitude' as const, 'latitude' as const), ([d, m, hundredths, isNegative], axis) => {
        const s = hundredths / 100;
        const expected = (isNegative ? -1 : 1) * (d + m / 60 + s / 3600);
        const letter = { longitude: 'EW', latitude: 'NS' }[axis][isNegative ? 1 : 0];
        for (const text of ways(d, m, s, letter, isNegative ? '-' : '')) expect(parseCoordinate(text, axis)).toBeCloseTo(expected, 12);
        expect(parseCoordinate(`${d}:${m}${letter}`, axis)).toBeCloseTo((isNegative ? -1 : 1) * (d + m / 60), 12);
        expect(parseCoordinate(`${d + m / 64}${letter}`, axis)).toBe((isNegative ? -1 : 1) * (d + m / 64) + 0);
      }),
    );
  });

  it('keeps the sign of zero degrees', () => {
    expect(parseCoordinate('-0 30 0', 'latitude')).toBe(-0.5);
    expect(parseCoordinate("0°30'S", 'latitude')).toBe(-0.5);
  });

  it('brings longitudes into [-180, 180) and leaves the rest of the circle alone', () => {
    fc.assert(
      fc.property(fc.double({ min: -180, max: 360, noNaN: true }), (lon) => {
        const placed = parseCoordinate(String(lon), 'longitude');
        expect(placed >= -180 && placed < 180).toBe(true);
        expect(placed).toBe(lon >= 180 ? lon - 360 : lon + 0);
      }),
    );
    expect(parseCoordinate('190:30:00', 'longitude')).toBe(-169.5);
    expect(parseCoordinate('180 E', 'longitude')).toBe(-180);
  });

  it.each(['90.0000001', '-91', '95 N', "89°60'", '1 000', '5 100', '12 30 45 10', 'N', '°', '5 W', '5..5', '12:30:'])(
    'gives NaN and a reason for the latitude "%s"',
    (text) => {
      expect(parseCoordinate(text, 'latitude')).toBeNaN();
      expect(explainCoordinate(text, 'latitude', false)).toMatch(/\.$/);
    },
  );
});

describe('parseCoordinate of long text', () => {
  it('gives NaN at once', () => {
    for (const text of ['x'.repeat(1_000_000), `${'1 '.repeat(500_000)}N`, '1'.repeat(1_000_000)]) expect(parseCoordinate(text, 'latitude')).toBeNaN();
  });
});

describe('parseTime', () => {
  it('agrees with the language on every moment of the calendar', () => {
    fc.assert(
      fc.property(fc.date({ min: new Date('0001-01-01T00:00:00Z'), max: new Date('9999-12-31T23:59:59Z'), noInvalidDate: true }), (date) => {
        const seconds = Math.floor(date.getTime() / 1000);
        const text = date.toISOString();
        const whole = text.replace(/\.\d+Z$/, '');
        expect(parseTime(text)).toBeCloseTo(date.getTime() / 1000, 3);
        for (const way of [`${whole}Z`, whole, whole.replace('T', ' '), whole.replace(/[-:]/g, ''), `${whole}+00:00`]) {
          expect(parseTime(way)).toBe(seconds);
          const bytes = utf8(way);
          expect(parseTimeBytes(bytes, 0, bytes.length, () => way)).toBe(seconds);
        }
        expect(parseTime(`${whole}+05:30`)).toBe(seconds - 19_800);
        expect(parseTime(`${whole}-0300`)).toBe(seconds + 10_800);
      }),
    );
  });

  it('reads plain numbers as Unix seconds, but eight digits as a date', () => {
    expect(parseTime('1772366400.25')).toBe(1_772_366_400.25);
    expect(parseTime('-1')).toBe(-1);
    expect(parseTime('20260301')).toBe(Date.UTC(2026, 2, 1) / 1000);
  });

  // ISO 8601 leap second: POSIX counts 23:59:60 as the next second
  it('counts a leap second as the next second', () => {
    expect(parseTime('2016-12-31T23:59:60Z')).toBe(Date.UTC(2017, 0, 1) / 1000);
  });

  it.each(['2025-02-29', '2026-13-01', '2026-00-10', '2026-04-31', '2026-01-01T24:00:00Z', '2026-01-01T12:60:00Z', '2026-01-01T00:00:61Z', '2026-01-01T00:00:00+25:00', '1e20', '1772366400000', '31.12.2026', '12:00', 'now', '0000-01-01'])(
    'gives NaN and a reason for "%s"',
    (text) => {
      const bytes = utf8(text);
      expect(parseTime(text)).toBeNaN();
      expect(parseTimeBytes(bytes, 0, bytes.length, () => text)).toBeNaN();
      expect(explainTime(text)).toMatch(/\.$/);
    },
  );
});
