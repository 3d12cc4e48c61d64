import { NumericalError } from '#core/errors.ts';
import type { NumericalErrorCode } from '#core/errors.ts';

export type ObservationFormat = 'csv' | 'geojson';

interface Signature {
  bytes: number[];
  what: string;
  advice: string;
}

const AS_CSV = 'Open it in the program that made it and save it as CSV (UTF-8), then upload that file.';
const UNPACK = 'Unpack it and upload the CSV or GeoJSON file inside.';

const SIGNATURES: Signature[] = [
  { bytes: [0x50, 0x4b, 0x03, 0x04], what: 'a spreadsheet or a zip archive', advice: `${AS_CSV} From an archive, unpack the CSV file first.` },
  { bytes: [0x50, 0x4b, 0x05, 0x06], what: 'an empty zip archive', advice: UNPACK },
  { bytes: [0xd0, 0xcf, 0x11, 0xe0, 0xa1, 0xb1, 0x1a, 0xe1], what: 'a spreadsheet or office document', advice: AS_CSV },
  { bytes: [0x89, 0x48, 0x44, 0x46, 0x0d, 0x0a, 0x1a, 0x0a], what: 'a NetCDF-4 or HDF5 file', advice: 'Write its observations as CSV or GeoJSON points and upload that file.' },
  { bytes: [0x43, 0x44, 0x46, 0x01], what: 'a NetCDF file', advice: 'Write its observations as CSV or GeoJSON points and upload that file.' },
  { bytes: [0x43, 0x44, 0x46, 0x02], what: 'a NetCDF file', advice: 'Write its observations as CSV or GeoJSON points and upload that file.' },
  { bytes: [0x43, 0x44, 0x46, 0x05], what: 'a NetCDF file', advice: 'Write its observations as CSV or GeoJSON points and upload that file.' },
  { bytes: [0x1f, 0x8b], what: 'a gzip-compressed file', advice: UNPACK },
  { bytes: [0x42, 0x5a, 0x68], what: 'a bzip2-compressed file', advice: UNPACK },
  { bytes: [0xfd, 0x37, 0x7a, 0x58, 0x5a, 0x00], what: 'an xz-compressed file', advice: UNPACK },
  { bytes: [0x28, 0xb5, 0x2f, 0xfd], what: 'a zstd-compressed file', advice: UNPACK },
  { bytes: [0x37, 0x7a, 0xbc, 0xaf, 0x27, 0x1c], what: 'a 7z archive', advice: UNPACK },
  { bytes: [0x25, 0x50, 0x44, 0x46, 0x2d], what: 'a PDF document', advice: 'Upload the data that it was made from, as CSV or GeoJSON.' },
  { bytes: [0x89, 0x50, 0x4e, 0x47], what: 'a PNG picture', advice: 'Upload the data that it was made from, as CSV or GeoJSON.' },
  { bytes: [0xff, 0xd8, 0xff], what: 'a JPEG picture', advice: 'Upload the data that it was made from, as CSV or GeoJSON.' },
  { bytes: [0x53, 0x51, 0x4c, 0x69, 0x74, 0x65, 0x20, 0x66], what: 'an SQLite or GeoPackage database', advice: 'Export the table of points as CSV or GeoJSON.' },
  { bytes: [0x50, 0x41, 0x52, 0x31], what: 'a Parquet file', advice: 'Write its rows as CSV.' },
  { bytes: [0x47, 0x52, 0x49, 0x42], what: 'a GRIB file', advice: 'Write its observations as CSV or GeoJSON points.' },
  { bytes: [0x42, 0x55, 0x46, 0x52], what: 'a BUFR file', advice: 'Write its observations as CSV or GeoJSON points.' },
];

/** Share of control characters, or of bytes beyond ASCII in no UTF-8 order, above which bytes are not text. */
const MOST_CONTROL = 0.02;
const MOST_DISORDER = 0.3;

const fail = (code: NumericalErrorCode, message: string, what: string): NumericalError =>
  new NumericalError(code, message, { details: { what } });

/**
 * The format of a file by its first bytes (4 KiB or more, or the whole file). Single rows that are not UTF-8 are left
 * to the reader, which rejects them by line.
 * @throws NumericalError FILE_EMPTY; FILE_NOT_TEXT for spreadsheets, archives, NetCDF, HDF5, UTF-16 and other binary
 * files; FILE_FORMAT_UNKNOWN for text of another kind. Each says what the file is and what to upload instead.
 */
export const detectFormat = (head: Uint8Array): ObservationFormat => {
  if (head.length === 0) throw fail('FILE_EMPTY', 'The file is empty (0 bytes). Choose a file with observations.', 'empty');
  for (const { bytes, what, advice } of SIGNATURES)
    if (bytes.every((byte, i) => head[i] === byte)) throw fail('FILE_NOT_TEXT', `The file is ${what}, not a text file. ${advice}`, what);
  checkText(head);

  const text = new TextDecoder('utf-8').decode(head).trimStart();
  if (text === '') throw fail('FILE_EMPTY', 'The file holds nothing but spaces and empty lines. Choose a file with observations.', 'blank');
  if (text[0] === '{') return 'geojson';
  if (text[0] === '[' && /^\[\s*[[{"\d\]-]/.test(text))
    throw fail('FILE_FORMAT_UNKNOWN', 'The file is a JSON list, not GeoJSON. Wrap its points in a GeoJSON FeatureCollection, or save them as CSV.', 'json');
  if (/^<(\?xml|!doctype|html|kml|gpx|[a-z]+[\s>])/i.test(text))
    throw fail('FILE_FORMAT_UNKNOWN', 'The file is XML or a web page, not a table. Save the observations as CSV or GeoJSON points.', 'markup');
  return 'csv';
};

const checkText = (head: Uint8Array): void => {
  const isUtf16Marked = (head[0] === 0xff && head[1] === 0xfe) || (head[0] === 0xfe && head[1] === 0xff);
  const zeros = [0, 0];
  let control = 0;
  for (let i = 0; i < head.length; i++) {
    if (head[i] === 0) zeros[i % 2]++;
    if (head[i] < 0x20 && head[i] !== 0x09 && head[i] !== 0x0a && head[i] !== 0x0d && head[i] !== 0x0c) control++;
  }
  const isUtf16 = isUtf16Marked || (Math.max(...zeros) > head.length / 4 && Math.min(...zeros) < head.length / 20);
  if (isUtf16)
    throw fail('FILE_NOT_TEXT', 'The file is encoded in UTF-16 ("Unicode text"). Save it as CSV with UTF-8 encoding and upload that file.', 'utf-16');
  if (zeros[0] + zeros[1] > 0 || control > MOST_CONTROL * head.length || disorder(head) > MOST_DISORDER)
    throw fail('FILE_NOT_TEXT', 'The file holds binary data, not text. Upload a CSV file or GeoJSON points, encoded in UTF-8.', 'binary');
};

/** Share of all bytes that are beyond ASCII and not part of a well-formed UTF-8 sequence (RFC 3629). */
const disorder = (bytes: Uint8Array): number => {
  let stray = 0;
  for (let i = 0; i < bytes.length; ) {
    const lead = bytes[i];
    const length = lead < 0x80 ? 1 : lead >= 0xc2 && lead < 0xe0 ? 2 : lead >= 0xe0 && lead < 0xf0 ? 3 : lead >= 0xf0 && lead < 0xf5 ? 4 : 0;
    let isWhole = length > 0;
    for (let k = 1; k < length; k++) if (i + k < bytes.length && (bytes[i + k] & 0xc0) !== 0x80) isWhole = false;
    if (!isWhole) stray++;
    i += isWhole ? length : 1;
  }
  return stray / bytes.length;
};
