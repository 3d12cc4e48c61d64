import { readFileSync } from 'node:fs';
import { createRequire } from 'node:module';

import fc from 'fast-check';
import { describe, expect, it } from 'vitest';

import { NumericalError } from '#core/errors.ts';
import { readCsvObservations, sniffCsv } from '#core/formats/csv-observations.ts';
import type { Mapping, ReadResult, RejectedRow } from '#core/formats/mapping.ts';

import { failure, readAny, readSample, sampleBytes, utf8 } from './sample-file.ts';

const read = (text: string, mapping?: Mapping): Promise<ReadResult> => readCsvObservations([utf8(text)], mapping);
const lonLat: Mapping = { coordinates: 'lonlat', planeUnit: 'km', x: 0, y: 1 };

describe('sniffCsv', () => {
  it.each([
    ['lon,lat,value\n1.5,2.5,3\n', ','],
    ['lon;lat;value\n1,5;2,5;3,5\n', ';'],
    ['lon\tlat\tname\n1\t2\tan inner bay\n3\t4\tthe outer one\n', '\t'],
    ['lon|lat|time\n1|2|2026-01-01 12:00:00\n', '|'],
    ['lon lat value\n1 2 3\n', ' '],
    ['name,lon,lat\n"Bay; inner",1,2\n"Bay; outer",3,4\n', ','],
    ['time,lon,lat\n2026-01-01 00:00:00,1,2\n2026-01-01 01:00:00,3,4\n', ','],
    ['lat,lon\n12 30 45 S,10 15 30 E\n13 30 45 S,11 15 30 E\n', ','],
    ['a;b\n1,5;2,25\n', ';'],
    ['lon\tlat\ttrack\n1\t2\tleg 1\n3\t4\tleg 2\n', '\t'],
    ['1\t2\tleg 1\n3\t4\tleg 2\n', '\t'],
  ])('finds the delimiter of %j', (text, delimiter) => {
    expect(sniffCsv(utf8(text)).delimiter).toBe(delimiter);
  });

  it.each<[string, Partial<Mapping>]>([
    ['Longitude,Latitude', { coordinates: 'lonlat', x: 0, y: 1 }],
    ['lat_deg,lon_deg', { coordinates: 'lonlat', x: 1, y: 0 }],
    ['x,y,lon,lat', { coordinates: 'lonlat', x: 2, y: 3 }],
    ['x [m],y [m]', { coordinates: 'plane', planeUnit: 'm', x: 0, y: 1 }],
    ['Easting (km),Northing (km)', { coordinates: 'plane', planeUnit: 'km', x: 0, y: 1 }],
    ['x_m,y_m', { coordinates: 'plane', planeUnit: 'm', x: 0, y: 1 }],
    ['lon,lat,u,v', { value: 2, value2: 3 }],
    ['lon,lat,sst,sst_error', { value: 2, errorSd: 3 }],
    ['lon,lat,StationId,qualityFlag,validTime,depth [m]', { station: 2, flag: 3, time: 4, level: 5 }],
    ['lon,lat,obs value,std dev,qc', { value: 2, errorSd: 3, flag: 4 }],
  ])('maps the header %j', (header, expected) => {
    const row = header.split(',').map((_, k) => k + 1).join(',');
    expect(sniffCsv(utf8(`${header}\n${row}\n`)).mapping).toMatchObject(expected);
  });

  it('leaves coordinates open where no header tells them', () => {
    const { mapping, hasHeader, columns } = sniffCsv(utf8('1,2,3\n4,5,6\n'));
    expect([mapping.x, mapping.y, hasHeader]).toEqual([undefined, undefined, false]);
    expect(columns.map(({ name }) => name)).toEqual(['column 1', 'column 2', 'column 3']);
  });

  it('shows the first rows and examples, and not the row that the head cuts', () => {
    const line = 'first station,1.25,2.5\n';
    const head = utf8(`name,lon,lat\n${line.repeat(4000)}`).subarray(0, 2 ** 16);
    const { rows, columns } = sniffCsv(head);
    expect(rows.length).toBe(20);
    expect(rows[0]).toEqual(['first station', '1.25', '2.5']);
    expect(columns[1].examples).toEqual(['1.25', '1.25', '1.25']);
  });
});

describe('readCsvObservations', () => {
  it('takes columns by header name and says which columns there are when one is missing', async () => {
    const { columns } = await read('a,b,c\n1,2,3\n', { coordinates: 'plane', planeUnit: 'm', x: 'C', y: 'a ' });
    expect([columns.x[0], columns.y[0]]).toEqual([0.003, 0.001]);
    const error = await failure(() => read('a,b,c\n1,2,3\n', { ...lonLat, value: 'd' }));
    expect([error.code, error.message]).toEqual(['COLUMN_MISSING', 'No column is named "d", which is chosen for value. The columns are: a, b, c.']);
    expect((await failure(() => read('a,b\n1,2\n', { ...lonLat, y: 7 }))).message).toMatch(/Column 8 is chosen for latitude, but the file has 2/);
    expect((await failure(() => read('a,b\n1,2\n', { ...lonLat, delimiter: ';' }))).message).toMatch(/no semicolon.*another delimiter/);
  });

  it('gives the same result however the bytes are cut', async () => {
    const files = ['good/quoted-lines.csv', 'good/mark-and-crlf.csv', 'good/carriage-returns.csv', 'bad/open-quote.csv', 'bad/field-count.csv'];
    for (const file of files) {
      const bytes = sampleBytes(file);
      const whole = await readSample(file);
      for (const size of [1, 2, 3, 7]) {
        const pieces = Array.from({ length: Math.ceil(bytes.length / size) }, (_, k) => bytes.subarray(k * size, (k + 1) * size));
        expect(await readCsvObservations(pieces, undefined)).toEqual(whole);
      }
    }
  });

  it('reads many blocks, cut anywhere, with the right line numbers', async () => {
    const rows = Array.from({ length: 30_000 }, (_, k) => (k % 1000 === 999 ? `"a\n""b",${k % 360},95\r\n` : `"name, ${k}",${k % 360},${k % 90}\r\n`));
    const bytes = utf8(`name,lon,lat\r\n${rows.join('')}`);
    for (const size of [65_536, 65_537, 99_991, bytes.length]) {
      const pieces = Array.from({ length: Math.ceil(bytes.length / size) }, (_, k) => bytes.subarray(k * size, (k + 1) * size));
      const { rejected, rowsRead, columns } = await readCsvObservations(pieces, undefined);
      expect([rowsRead, rejected.length, columns.x.length]).toEqual([30_000, 30, 29_970]);
      // every rejected row spans two lines
      expect(rejected.map(({ line }) => line)).toEqual(Array.from({ length: 30 }, (_, k) => 1001 + 1001 * k));
    }
  });

  it('hands over every rejected row in batches, keeps few, and counts all', async () => {
    const text = `lon,lat\n${'1,x\n'.repeat(3500)}1,2\n`;
    const handed: RejectedRow[][] = [];
    const pieces = [utf8(text).subarray(0, 5000), utf8(text).subarray(5000)];
    const { rejected, rejectedCount } = await readCsvObservations(pieces, undefined, {
      maxRejectedKept: 10,
      onRejected: async (batch) => {
        await Promise.resolve();
        handed.push(batch);
      },
    });
    expect([rejected.length, rejectedCount]).toEqual([10, 3500]);
    expect(handed.map(({ length }) => length)).toEqual([1000, 1000, 1000, 500]);
    expect(handed.flat().map(({ line }) => line)).toEqual(Array.from({ length: 3500 }, (_, k) => k + 2));
  });

  it('says why none of the rows can be used', async () => {
    const error = await failure(() => read(`lon,lat\n${'5,95\n'.repeat(100)}`));
    expect(error.code).toBe('NO_ROW_ACCEPTED');
    expect(error.message).toMatch(/None of the 100 rows.*line 2, lat: "95".*between -90 and 90/);
    expect(error.details).toMatchObject({ rowsRead: 100, rejectedCount: 100 });
  });

  it('rejects a row that never ends and goes on after it', async () => {
    const { rejected, columns } = await read(`lon,lat\n1,2\n${'9'.repeat(3_000_000)}\n3,4\n"${'x'.repeat(1_000_000)}\n5,6\n`);
    expect(rejected.map(({ line, reason }) => [line, reason.slice(0, 27)])).toEqual([
      [3, 'The row is longer than 262,'],
      [5, 'The row is longer than 262,'],
    ]);
    expect(rejected.every(({ found }) => found.length === 200)).toBe(true);
    expect([...columns.line]).toEqual([2, 4, 6]);
  });

  it('stops when cancelled, and where there are too many rows', async () => {
    let calls = 0;
    const pieces = Array.from({ length: 10 }, () => utf8('1,2\n'.repeat(20_000)));
    const options = { isCancelled: () => ++calls > 3 };
    expect((await failure(() => readCsvObservations([utf8('lon,lat\n'), ...pieces], undefined, options))).code).toBe('CANCELLED');
    const error = await failure(() => readCsvObservations([utf8('lon,lat\n'), ...pieces], undefined, { maxRows: 1000 }));
    expect([error.code, error.message]).toEqual(['FILE_TOO_LARGE', 'The file has more than 1,000 usable rows (reached at line 1002). Split it, or thin it before the upload.']);
  });

  it('reports progress up to the last byte', async () => {
    const bytes = utf8(`lon,lat\n${'1,2\n'.repeat(600_000)}`);
    const seen: number[] = [];
    await readCsvObservations([bytes], undefined, { onProgress: ({ bytes: done }) => seen.push(done) });
    expect(seen.length).toBeGreaterThan(2);
    expect(seen.at(-1)).toBe(bytes.length);
    expect(seen).toEqual([...seen].sort((a, b) => a - b));
  });

  it('shows control characters in rejected text instead of passing them on', async () => {
    const { rejected } = await read('lon,lat,station\n1,2,ok\n1,\u00072,ok\n1,2,a\u0000b\n');
    expect(rejected.map(({ found }) => found)).toEqual(['\u24072', 'a\u2400b']);
  });
});

describe('real data: airport locations', () => {
  const path = createRequire(import.meta.url).resolve('vega-datasets/data/airports.csv');

  it('reads every line of the file as one airport', async () => {
    const bytes = readFileSync(path);
    const lines = bytes.toString('utf8').trimEnd().split('\n').length;
    const { columns, rowsRead, rejectedCount } = await readAny(bytes);
    expect([rowsRead, rejectedCount]).toEqual([lines - 1, 0]);
    expect(columns.station?.names.length).toBe(lines - 1);
    // line 2 of the file: 00M,Thigpen,Bay Springs,MS,USA,31.95376472,-89.23450472
    expect([columns.station?.names[0], columns.y[0], columns.x[0], columns.line[0]]).toEqual(['00M', 31.95376472, -89.23450472, 2]);
  });
});

/** Every row is accounted for, and whatever goes wrong is explained. */
const accounted = async (bytes: Uint8Array): Promise<void> => {
  try {
    const { columns, rowsRead, rejectedCount, rejected } = await readAny(bytes);
    expect(rowsRead).toBe(columns.x.length + rejectedCount);
    expect(columns.x.every(Number.isFinite) && columns.y.every(Number.isFinite)).toBe(true);
    for (const { found, reason } of rejected) {
      expect(found.length).toBeLessThanOrEqual(200);
      expect(reason).toMatch(/\.$/);
    }
  } catch (error) {
    if (!(error instanceof NumericalError)) throw error;
    expect(error.message).toMatch(/\.$/);
  }
};

const SAMPLES = ['good/sexagesimal.csv', 'good/quoted-lines.csv', 'good/semicolon-decimal-comma.csv', 'good/times.csv', 'good/spaces.txt', 'good/points.geojson', 'bad/polygon.geojson'];

describe('any bytes', () => {
  it('are read or refused with an explanation', async () => {
    await fc.assert(fc.asyncProperty(fc.uint8Array({ maxLength: 3000 }), accounted), { numRuns: 300 });
  });

  it('of a table of odd fields are read or refused with an explanation', async () => {
    const field = fc.oneof(
      fc.constantFrom('', '"', '""', '"a', 'a"b', '\u0000', '-', '1e400', '12°', "5'6", '1;2', 'lon', 'lat', '#', '\ud800', '\u2212180', '+90', '1,5'),
      fc.double().map(String),
      fc.string({ maxLength: 8 }),
    );
    const end = fc.constantFrom('\n', '\r\n', '\r', '\n\n');
    const table = fc.array(fc.tuple(fc.array(field, { maxLength: 5 }), end), { maxLength: 30 });
    const text = fc.tuple(fc.constantFrom(',', ';', '\t', '|', ' '), fc.constantFrom('', 'lon,lat\n', 'x;y\n'), table);
    await fc.assert(
      fc.asyncProperty(text, ([delimiter, header, rows]) => accounted(utf8(header + rows.map(([fields, e]) => fields.join(delimiter) + e).join('')))),
      { numRuns: 500 },
    );
  });

  it('changed, cut or repeated in a sample file are read or refused with an explanation', async () => {
    const edit = fc.record({ file: fc.constantFrom(...SAMPLES), at: fc.double({ min: 0, max: 1, noNaN: true }), remove: fc.nat(20), insert: fc.uint8Array({ maxLength: 10 }) });
    await fc.assert(
      fc.asyncProperty(edit, ({ file, at, remove, insert }) => {
        const bytes = sampleBytes(file);
        const cut = Math.floor(at * bytes.length);
        return accounted(new Uint8Array([...bytes.subarray(0, cut), ...insert, ...bytes.subarray(cut + remove)]));
      }),
      { numRuns: 500 },
    );
  });
});
