import { describe, expect, it } from 'vitest';

import type { ObservationColumns } from '#core/design/observations.ts';
import { packArrays } from '#core/formats/array-bundle.ts';
import { packObservations, unpackObservations } from '#core/formats/observation-bundle.ts';

import { failure } from './sample-file.ts';

const columns: ObservationColumns = {
  crs: 'lonlat-deg',
  x: new Float64Array([-180, 0.1]),
  y: new Float64Array([90, -45]),
  line: new Uint32Array([2, 5]),
  value2: new Float64Array([NaN, 1]),
  errorSd: new Float64Array([0.5, NaN]),
  flag: { names: ['', 'good'], codes: new Uint32Array([1, 0]) },
};

describe('packObservations and unpackObservations', () => {
  it('give back the columns that there are and no others', () => {
    expect(unpackObservations(packObservations(columns))).toEqual(columns);
  });

  it('refuse what is not the columns of a set, naming the column', async () => {
    const { x, y, line } = columns;
    const base = { kind: 'observations', crs: 'lonlat-deg', names: {} };
    const cases: [Parameters<typeof packArrays>, RegExp][] = [
      [[{}, { x, y, line }], /something else/],
      [[null, { x, y, line }], /something else/],
      [[{ ...base, crs: 'mars' }, { x, y, line }], /coordinate reference/],
      [[base, { x, y }], /line is missing/],
      [[base, { x, y, line: new Uint32Array(3) }], /"line" has 3 rows/],
      [[base, { x, y, line, value: new Float32Array(2) }], /"value"/],
      [[base, { x: new Float64Array([1, NaN]), y, line }], /finite/],
      [[base, { x, y, line, flag: new Uint32Array(2) }], /"flag" has no list/],
      [[{ ...base, names: { flag: ['a'] } }, { x, y, line, flag: new Uint32Array([0, 1]) }], /"flag" points/],
    ];
    for (const [[meta, arrays], says] of cases) {
      const error = await failure(() => unpackObservations(packArrays(meta, arrays)));
      expect(error.code).toBe('FILE_MALFORMED');
      expect(error.message).toMatch(says);
    }
  });
});
