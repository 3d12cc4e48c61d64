import { describe, expect, it } from 'vitest';

import { failure, readSample } from './sample-file.ts';

/** Files that give no observations: code, and what the message must say. */
const refused: [file: string, code: string, says: RegExp][] = [
  ['empty.csv', 'FILE_EMPTY', /0 bytes.*Choose/],
  ['blank.csv', 'FILE_EMPTY', /empty lines.*Choose/],
  ['one-column.csv', 'COLUMN_MISSING', /Only one column.*"observation".*comma between/],
  ['header-only.csv', 'NO_ROW_ACCEPTED', /no rows of data.*Add rows/],
  ['unnamed-columns.csv', 'COLUMN_MISSING', /The columns are: a, b, c.*Choose/],
  ['workbook.csv', 'FILE_NOT_TEXT', /spreadsheet.*save it as CSV/],
  ['old-workbook.csv', 'FILE_NOT_TEXT', /spreadsheet.*save it as CSV/],
  ['netcdf-classic.csv', 'FILE_NOT_TEXT', /NetCDF.*as CSV/],
  ['netcdf-4.csv', 'FILE_NOT_TEXT', /NetCDF-4 or HDF5.*as CSV/],
  ['gzipped.csv', 'FILE_NOT_TEXT', /gzip.*Unpack/],
  ['rubbish.csv', 'FILE_NOT_TEXT', /binary data.*CSV/],
  ['utf-16.csv', 'FILE_NOT_TEXT', /UTF-16.*UTF-8/],
  ['utf-16-unmarked.csv', 'FILE_NOT_TEXT', /UTF-16.*UTF-8/],
  ['web-page.csv', 'FILE_FORMAT_UNKNOWN', /web page.*CSV/],
  ['list.json', 'FILE_FORMAT_UNKNOWN', /JSON list.*FeatureCollection/],
  ['other-crs.geojson', 'FILE_FORMAT_UNKNOWN', /EPSG::32633.*RFC 7946.*projected x and y/],
  ['cut-off.geojson', 'FILE_MALFORMED', /ends too early.*copy it again/],
  ['misplaced-comma.geojson', 'FILE_MALFORMED', /line 4/],
  ['lines-of-features.geojson', 'FILE_MALFORMED', /one object on each line.*FeatureCollection/],
  ['other-object.geojson', 'FILE_FORMAT_UNKNOWN', /"Topology".*FeatureCollection/],
  ['invalid-utf-8.geojson', 'FILE_NOT_TEXT', /Line 2.*UTF-8/],
];

/** Files with rows at fault: line, field, text found, and what the reason must say; and how many rows are kept. */
const partly: Record<string, { accepted: number; rejected: [number, string, string, RegExp][] }> = {
  'invalid-utf-8.csv': {
    accepted: 2,
    rejected: [
      [3, 'station', 'K\ufffdbenpunkt', /UTF-8/],
      [5, 'lat', '8\ufffd', /UTF-8/],
    ],
  },
  'out-of-range.csv': {
    accepted: 1,
    rejected: [
      [2, 'lat', '95', /between -90 and 90.*mapping/],
      [3, 'lon', '400', /between -180 and 360.*map/],
      [4, 'lat', '-90.0001', /between -90 and 90/],
      [5, 'lon', '-180.5', /between -180 and 360/],
    ],
  },
  'not-numbers.csv': {
    accepted: 1,
    rejected: [
      [2, 'value', 'NaN', /not a number.*empty/],
      [3, 'lon', 'NaN', /not a number.*empty/],
      [4, 'lat', 'inf', /infinite/i],
      [5, 'value', 'warm', /text where a number.*map/],
      [6, 'value', '1e999', /too large/],
      [7, 'value', '1,5', /decimal comma/],
      [8, 'value', '0x10', /Hexadecimal/],
      [9, 'lon', '1 000', /thousands separators/],
    ],
  },
  'error-sd.csv': {
    accepted: 2,
    rejected: [
      [2, 'sd', '0', /above 0/],
      [3, 'sd', '-0.5', /above 0/],
      [6, 'sd', '-0', /above 0/],
    ],
  },
  'missing-coordinates.csv': {
    accepted: 1,
    rejected: [
      [2, 'lon', '', /missing/],
      [3, 'lat', '', /missing/],
      [4, 'lon', '', /missing/],
    ],
  },
  'field-count.csv': {
    accepted: 1,
    rejected: [
      [2, 'row', '5,60', /2 fields where 3/],
      [3, 'row', '5,60,1,2', /4 fields where 3/],
      [5, 'row', '5', /1 fields? where 3/],
    ],
  },
  'sexagesimal.csv': {
    accepted: 1,
    rejected: [
      [2, 'lon', '10°75\'00"E', /below 60/],
      [3, 'lat', '12°30\'61"S', /below 60/],
      [4, 'lon', '10°15\'30"N', /letter N belongs to a latitude/],
      [5, 'lat', '-12 30 00 S', /sign and a letter/],
      [6, 'lat', 'S12 30 00 S', /letter before and one after/],
      [7, 'lat', "12.5°30'S", /Only the last/],
      [8, 'lat', '91°00\'00"N', /between -90 and 90/],
      [9, 'lat', '12::30', /not a latitude/],
    ],
  },
  'times.csv': {
    accepted: 1,
    rejected: [
      [2, 'time', '2026-02-30', /no such date/],
      [3, 'time', '01/02/2026', /Day and month/],
      [4, 'time', '2026-01-01T25:00:00Z', /no such date or time/],
      [5, 'time', '1772366400000', /milliseconds/],
      [6, 'time', 'noon', /ISO 8601/],
    ],
  },
  'open-quote.csv': { accepted: 3, rejected: [[3, 'row', '"B,3,4', /never closed/]] },
  'text-after-quote.csv': { accepted: 1, rejected: [[2, 'row', '"A" x,1,2', /after a closing quote/]] },
  'polygon.geojson': {
    accepted: 1,
    rejected: [
      [1, 'geometry', 'Polygon', /Only points/],
      [2, 'geometry', 'null', /no geometry/],
      [3, 'coordinates', '[5, 95]', /between -90 and 90/],
      [4, 'value', 'warm', /text where a number/],
      [5, 'feature', 'Point', /Wrap this in a Feature/],
      [6, 'coordinates', '[5, 60]', /finite numbers/],
    ],
  },
};

describe('bad sample files', () => {
  it.each(refused)('refuses %s with %s', async (file, code, says) => {
    const error = await failure(() => readSample(`bad/${file}`));
    expect(error.code).toBe(code);
    expect(error.message).toMatch(says);
  });

  it.each(Object.entries(partly))('names every row at fault in %s', async (file, { accepted, rejected }) => {
    const result = await readSample(`bad/${file}`);
    expect(result.rejected.map(({ line, field, found }) => [line, field, found])).toEqual(rejected.map((row) => row.slice(0, 3)));
    for (const [k, row] of rejected.entries()) expect(result.rejected[k].reason).toMatch(row[3]);
    expect(result.columns.x.length).toBe(accepted);
    expect(result.rowsRead).toBe(accepted + rejected.length);
    expect(result.rejectedCount).toBe(rejected.length);
  });
});
