import type { ObservationColumns } from '#core/design/observations.ts';
import { readCsvObservations } from '#core/formats/csv-observations.ts';
import { detectFormat } from '#core/formats/detect-format.ts';
import { readGeoJsonObservations } from '#core/formats/geojson-observations.ts';
import type { Mapping } from '#core/formats/mapping.ts';
import { packObservations } from '#core/formats/observation-bundle.ts';
import { observationFacts, type ObservationFacts } from '#core/design/observation-facts.ts';

import type { ThreadTools } from '../numerics.thread.ts';

export interface ReadCall {
  kind: 'read-observations';
  /** The file's bytes in order. */
  chunks: Uint8Array[];
  mapping: Mapping | undefined;
}

export interface ReadAnswer {
  format: 'csv' | 'geojson';
  crs: ObservationColumns['crs'];
  mapping: Mapping;
  rowsRead: number;
  accepted: number;
  rejectedCount: number;
  facts: ObservationFacts;
  columnsBundle: Uint8Array;
}

/** Rejected rows that a refused file's problem tells of. */
const REJECTED_SHOWN = 20;

/** Columns and everything known of an uploaded file; rejected rows go out in batches. @throws NumericalError of the readers */
export const readObservations = async ({ chunks, mapping }: ReadCall, tools: ThreadTools): Promise<ReadAnswer> => {
  const total = chunks.reduce((sum, chunk) => sum + chunk.length, 0);
  const format = detectFormat(chunks[0] ?? new Uint8Array());
  const options = {
    onProgress: ({ bytes, rows }: { bytes: number; rows: number }) => tools.report((0.9 * bytes) / total, `reading: ${rows.toLocaleString('en')} rows`),
    onRejected: (batch: unknown) => tools.sendBatch(batch),
    maxRejectedKept: REJECTED_SHOWN,
  };
  const result = format === 'csv' ? await readCsvObservations(chunks, mapping, options) : await readGeoJsonObservations(joined(chunks, total), mapping, options);
  return {
    format,
    crs: result.columns.crs,
    mapping: result.mapping,
    rowsRead: result.rowsRead,
    accepted: result.columns.x.length,
    rejectedCount: result.rejectedCount,
    facts: observationFacts(result.columns),
    columnsBundle: packObservations(result.columns),
  };
};

const joined = (chunks: Uint8Array[], total: number): Uint8Array => {
  if (chunks.length === 1) return chunks[0];
  const bytes = new Uint8Array(total);
  let at = 0;
  for (const chunk of chunks) {
    bytes.set(chunk, at);
    at += chunk.length;
  }
  return bytes;
};
