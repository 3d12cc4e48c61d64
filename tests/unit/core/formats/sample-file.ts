import { readFileSync } from 'node:fs';

import { NumericalError } from '#core/errors.ts';
import { readCsvObservations } from '#core/formats/csv-observations.ts';
import { detectFormat } from '#core/formats/detect-format.ts';
import { readGeoJsonObservations } from '#core/formats/geojson-observations.ts';
import type { Mapping, ReadOptions, ReadResult } from '#core/formats/mapping.ts';

export const sampleBytes = (path: string): Uint8Array =>
  new Uint8Array(readFileSync(new URL(`../../../../fixtures/samples/${path}`, import.meta.url)));

/** What an upload does: the format by the first bytes, then its reader. */
export const readAny = async (bytes: Uint8Array, mapping?: Mapping, options?: ReadOptions): Promise<ReadResult> =>
  detectFormat(bytes) === 'csv' ? readCsvObservations([bytes], mapping, options) : readGeoJsonObservations(bytes, mapping, options);

export const readSample = (path: string, mapping?: Mapping, options?: ReadOptions): Promise<ReadResult> =>
  readAny(sampleBytes(path), mapping, options);

export const utf8 = (text: string): Uint8Array => new TextEncoder().encode(text);

/** The NumericalError that a call fails with; anything else is a failure of the test. */
export const failure = async (call: () => unknown): Promise<NumericalError> => {
  try {
    await call();
  } catch (error) {
    if (error instanceof NumericalError) return error;
    throw error;
  }
  throw new Error('The call succeeded.');
};
