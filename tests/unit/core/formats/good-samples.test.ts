import { describe, expect, it } from 'vitest';

import { readSample } from './sample-file.ts';

const near = (values: ArrayLike<number>): number[] => Array.from(values, (v) => Math.round(v * 1e9) / 1e9);

describe('good sample files', () => {
  it('reads semicolons with decimal commas, and the units in headers', async () => {
    const { columns, mapping, rejectedCount } = await readSample('good/semicolon-decimal-comma.csv');
    expect(mapping).toMatchObject({ delimiter: ';', decimalComma: true, hasHeader: true, coordinates: 'lonlat', station: 0, value: 3, errorSd: 4 });
    expect(rejectedCount).toBe(0);
    expect([...columns.x]).toEqual([12.5, 12.75, 13]);
    expect([...columns.y]).toEqual([54.25, 54.5, 54.75]);
    expect([...(columns.value ?? [])]).toEqual([9.75, 10.125, -0.5]);
    expect([...(columns.errorSd ?? [])]).toEqual([0.25, 0.5, NaN]);
    expect(columns.station?.names).toEqual(['A1', 'A2', 'A3']);
  });

  it('reads tabs with empty fields, which are not given', async () => {
    const { columns, mapping } = await readSample('good/tabs.tsv');
    expect(mapping.delimiter).toBe('\t');
    expect([...columns.x]).toEqual([-179.5, 179.5, -180]);
    expect([...(columns.value ?? [])]).toEqual([1.5, NaN, -0.002]);
    expect([...(columns.errorSd ?? [])]).toEqual([0.1, 0.2, NaN]);
  });

  it('reads bars and projected coordinates in km', async () => {
    const { columns, mapping } = await readSample('good/bars.txt');
    expect(mapping).toMatchObject({ delimiter: '|', coordinates: 'plane', planeUnit: 'km' });
    expect(columns.crs).toBe('plane-km');
    expect([...columns.x]).toEqual([0, 12.5, 25]);
    expect([...columns.y]).toEqual([0, -3.25, 6.5]);
  });

  it('reads runs of spaces, passing over comments and empty lines but counting them', async () => {
    const { columns, mapping, rowsRead } = await readSample('good/spaces.txt');
    expect(mapping.delimiter).toBe(' ');
    expect(rowsRead).toBe(3);
    expect([...columns.line]).toEqual([4, 5, 7]);
    expect([...(columns.level ?? [])]).toEqual([5, 15, 25]);
    expect(columns.flag).toEqual({ names: ['0', '1'], codes: new Uint32Array([0, 1, 0]) });
  });

  it('reads every way of writing degrees, minutes and seconds as the same place', async () => {
    const { columns, rejected } = await readSample('good/sexagesimal.csv');
    expect(rejected).toEqual([]);
    expect(near(columns.y)).toEqual(near(Array<number>(6).fill(-(12 + 30 / 60 + 45.5 / 3600))));
    expect(near(columns.x)).toEqual(near(Array<number>(6).fill(10 + 15 / 60 + 30 / 3600)));
  });

  it('reads quoted fields with delimiters, line ends and doubled quotes', async () => {
    const { columns } = await readSample('good/quoted-lines.csv');
    expect(columns.station?.names).toEqual(['Pier, north lower level', 'Buoy "7"', 'plain']);
    expect([...columns.line]).toEqual([2, 4, 5]);
  });

  it('reads lines that end in a carriage return, the last one open', async () => {
    const { columns } = await readSample('good/carriage-returns.csv');
    expect([...columns.x]).toEqual([1, 4, 7]);
    expect([...columns.line]).toEqual([2, 3, 4]);
  });

  it('reads a byte-order mark, CRLF and letters beyond ASCII', async () => {
    const { columns } = await readSample('good/mark-and-crlf.csv');
    expect([...columns.x]).toEqual([20.5, 21]);
    expect(columns.station?.names).toEqual(['Købenpunkt', 'Pier']);
    expect([...columns.line]).toEqual([2, 3]);
  });

  it('converts metres and takes two components', async () => {
    const { columns, mapping } = await readSample('good/metres.csv');
    expect(mapping).toMatchObject({ coordinates: 'plane', planeUnit: 'm', value: 2, value2: 3, errorSd: 4, flag: 5 });
    expect([...columns.x]).toEqual([1, 3.5]);
    expect([...columns.y]).toEqual([2, 2.5]);
    expect([...(columns.value2 ?? [])]).toEqual([-0.25, 0.75]);
  });

  it('brings longitudes from 0..360 into [-180, 180)', async () => {
    const { columns } = await readSample('good/east-longitudes.csv');
    expect([...columns.x]).toEqual([0, 90, -180, -90, -0.5, 0]);
  });

  it('reads a file without header by a mapping', async () => {
    const { columns, mapping } = await readSample('good/no-header.csv', { coordinates: 'lonlat', planeUnit: 'km', x: 0, y: 1, value: 2 });
    expect(mapping.hasHeader).toBe(false);
    expect([...columns.x]).toEqual([5.5, 5.75]);
    expect([...columns.line]).toEqual([1, 2]);
  });

  // 2026-03-01T12:00:00Z is 1772366400 s by `date -u -d 2026-03-01T12:00:00Z +%s`
  it('reads ISO 8601 times and Unix seconds', async () => {
    const { columns } = await readSample('good/times.csv');
    const noon = 1_772_366_400;
    expect([...(columns.time ?? [])]).toEqual([noon, noon, noon + 0.5, noon, noon - 43_200, noon, NaN]);
  });

  it('keeps exact duplicates: the near-observation rule deals with them', async () => {
    const { rowsRead, rejectedCount, columns } = await readSample('good/duplicates.csv');
    expect([rowsRead, rejectedCount, columns.x.length]).toEqual([4, 0, 4]);
  });

  it('reads GeoJSON points of every nesting, lines being feature numbers', async () => {
    const { columns, rejectedCount, rowsRead } = await readSample('good/points.geojson');
    expect([rowsRead, rejectedCount]).toEqual([5, 0]);
    expect([...columns.x]).toEqual([10, -170, -170.5, 11, 12]);
    expect([...columns.y]).toEqual([60, 61, 61.5, 62, 63]);
    expect([...columns.line]).toEqual([1, 2, 2, 3, 3]);
    expect([...(columns.value ?? [])]).toEqual([1.5, NaN, NaN, NaN, NaN]);
    expect([...(columns.errorSd ?? [])]).toEqual([0.25, NaN, NaN, NaN, NaN]);
    expect(columns.station).toEqual({ names: ['A', 'B', ''], codes: new Uint32Array([0, 1, 1, 2, 2]) });
  });

  it('reads a single GeoJSON feature with the old member for the same reference', async () => {
    const { columns } = await readSample('good/feature.geojson');
    expect([columns.x[0], columns.y[0], columns.level?.[0], columns.flag?.names]).toEqual([1.5, -2.5, -5, ['true']]);
  });
});
