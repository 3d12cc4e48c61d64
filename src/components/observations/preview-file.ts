import { sniffCsv } from '#core/formats/csv-observations.ts';
import { SNIFF_BYTES } from '#core/formats/csv-sniff.ts';
import { detectFormat } from '#core/formats/detect-format.ts';
import { sniffGeoJson } from '#core/formats/geojson-observations.ts';
import type { Mapping } from '#schemas/observation-sets.ts';

export interface FilePreview {
  format: 'csv' | 'geojson';
  /** What a field can be mapped to: column index (CSV) or property name (GeoJSON), with the name shown. */
  columns: { key: number | string; name: string }[];
  /** First rows as text, in the order of `columns`. */
  rows: string[][];
  mapping: Mapping;
}

/** Largest GeoJSON file that the browser reads whole for the preview. */
const GEOJSON_PREVIEW = 8 * 2 ** 20;

/** Format, columns and first rows of a chosen file, read from its beginning. @throws NumericalError with what is wrong */
export const previewFile = async (file: Blob): Promise<FilePreview> => {
  const head = new Uint8Array(await file.slice(0, SNIFF_BYTES).arrayBuffer());
  if (detectFormat(head) === 'csv') {
    const { columns, rows, mapping } = sniffCsv(head);
    return { format: 'csv', columns: columns.map(({ name, index }) => ({ key: index, name: name || `column ${index + 1}` })), rows, mapping: mapping as Mapping };
  }
  if (file.size > GEOJSON_PREVIEW) return { format: 'geojson', columns: [], rows: [], mapping: { coordinates: 'lonlat', planeUnit: 'km' } };
  const { columns, rows, mapping } = sniffGeoJson(new Uint8Array(await file.arrayBuffer()));
  return { format: 'geojson', columns: columns.map(({ name }) => ({ key: name, name })), rows, mapping: mapping as Mapping };
};
