import { describe, expect, it } from 'vitest';

import { readGeoJsonObservations, sniffGeoJson } from '#core/formats/geojson-observations.ts';

import { failure, sampleBytes, utf8 } from './sample-file.ts';

const point = (coordinates: unknown, properties: unknown = {}) => ({ type: 'Feature', properties, geometry: { type: 'Point', coordinates } });
const collection = (...features: unknown[]): Uint8Array => utf8(JSON.stringify({ type: 'FeatureCollection', features }));

describe('readGeoJsonObservations', () => {
  it('suggests a mapping by property names and shows examples', () => {
    const { mapping, columns, rows } = sniffGeoJson(sampleBytes('good/points.geojson'));
    expect(mapping).toEqual({ coordinates: 'lonlat', planeUnit: 'km', station: 'station', value: 'value', errorSd: 'sd', time: 'time' });
    expect(columns[0]).toEqual({ name: 'station', examples: ['A', 'B'] });
    expect(rows[0]).toEqual(['A', '1.5', '0.25', '2026-03-01T00:00:00Z']);
  });

  it('reads projected positions when the mapping says so, whatever the old crs member', async () => {
    const mapping = { coordinates: 'plane', planeUnit: 'm' } as const;
    const { columns } = await readGeoJsonObservations(sampleBytes('bad/other-crs.geojson'), mapping);
    expect([columns.crs, columns.x[0], columns.y[0]]).toEqual(['plane-km', 500, 6600]);
  });

  it('rejects collections nested too deep, and survives any depth', async () => {
    const nest = (depth: number): string => `${'{"type":"GeometryCollection","geometries":['.repeat(depth)}{"type":"Point","coordinates":[1,2]}${']}'.repeat(depth)}`;
    expect((await readGeoJsonObservations(utf8(nest(10)), undefined)).columns.x.length).toBe(1);
    for (const depth of [40, 50_000]) {
      const error = await failure(() => readGeoJsonObservations(utf8(nest(depth)), undefined));
      expect(error.message).toMatch(/nested|JSON/);
    }
  });

  it('refuses a document that is too large, with the way out', async () => {
    const error = await failure(() => readGeoJsonObservations(collection(point([1, 2])), undefined, { maxBytes: 10 }));
    expect([error.code, error.message]).toEqual(['FILE_TOO_LARGE', expect.stringMatching(/as CSV/)]);
  });

  it('takes only properties of their own, and no objects for labels or numbers', async () => {
    const mapping = { coordinates: 'lonlat', planeUnit: 'km', station: 'constructor', value: 'v' } as const;
    const { columns, rejected } = await readGeoJsonObservations(collection(point([1, 2]), point([1, 2], { v: { a: 1 } }), point([1, 2], { constructor: [1] })), mapping);
    expect(columns.station?.names).toEqual(['']);
    expect(rejected.map(({ line, field, found }) => [line, field, found])).toEqual([
      [2, 'v', '{object}'],
      [3, 'constructor', '[list of 1]'],
    ]);
  });

  it('rejects halves of surrogate pairs in labels', async () => {
    const bytes = utf8('{"type":"FeatureCollection","features":[{"type":"Feature","properties":{"station":"a\\ud800"},"geometry":{"type":"Point","coordinates":[1,2]}},{"type":"Feature","properties":{"station":"ok"},"geometry":{"type":"Point","coordinates":[1,2]}}]}');
    const { rejected } = await readGeoJsonObservations(bytes, undefined);
    expect(rejected.map(({ line, found }) => [line, found])).toEqual([[1, 'a\ufffd']]);
  });

  it('stops when cancelled and hands over rejected rows', async () => {
    const many = collection(...Array.from({ length: 12_000 }, () => point([1, 95])), point([1, 2]));
    const batches: number[] = [];
    const { rejectedCount } = await readGeoJsonObservations(many, undefined, { onRejected: (batch) => void batches.push(batch.length) });
    expect([rejectedCount, batches.reduce((a, b) => a + b, 0), Math.max(...batches)]).toEqual([12_000, 12_000, 1000]);
    let calls = 0;
    expect((await failure(() => readGeoJsonObservations(many, undefined, { isCancelled: () => ++calls > 1 }))).code).toBe('CANCELLED');
  });
});
