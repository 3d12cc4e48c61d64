import { NumericalError } from '#core/errors.ts';

import { mapColumnNames } from './column-names.ts';
import { createCsvSplitter } from './csv-records.ts';
import type { CsvRecord } from './csv-records.ts';
import type { Delimiter, Mapping } from './mapping.ts';
import { parseCoordinate } from './parse-coordinate.ts';
import { parseNumber } from './parse-number.ts';
import { parseTime } from './parse-time.ts';

/** How many bytes from the start of a file a look at it needs. */
export const SNIFF_BYTES = 2 ** 16;

const ROWS_SNIFFED = 200;
const ROWS_SHOWN = 20;
const EXAMPLES_SHOWN = 3;
const DELIMITERS: Delimiter[] = [',', ';', '\t', '|', ' '];

export interface CsvSniff {
  delimiter: Delimiter;
  hasHeader: boolean;
  decimalComma: boolean;
  columns: { name: string; index: number; examples: string[] }[];
  /** What the header tells; x and y are absent where it does not tell them. */
  mapping: Mapping;
  /** The first rows below the header, as text. */
  rows: string[][];
}

/** What the caller knows already; the rest is detected. */
export interface CsvHints {
  delimiter?: Delimiter;
  hasHeader?: boolean;
  decimalComma?: boolean;
}

interface Look {
  delimiter: Delimiter;
  rows: string[][];
  fieldCount: number;
  /** Share of rows with the most frequent number of fields. */
  regular: number;
  /** Share of the filled fields below the first row that are numbers, coordinates or times. */
  numeric: number;
  decimalComma: boolean;
}

/**
 * A look at the first bytes of a delimited file (`SNIFF_BYTES` of them, or the whole file): the delimiter whose rows
 * are regular and hold most numbers, whether the first row is a header (no number in it), decimal commas (never with
 * the delimiter comma), columns with examples, and the mapping that the header suggests.
 * @throws NumericalError FILE_EMPTY, or COLUMN_MISSING where there is only one column.
 */
export const sniffCsv = (head: Uint8Array, hints: CsvHints = {}): CsvSniff => {
  const look = bestLook(head, hints);
  if (look.rows.length === 0)
    throw new NumericalError('FILE_EMPTY', 'The file holds no rows, only empty lines or comments. Choose another file.');
  if (look.fieldCount < 2) throw oneColumn(look, hints);

  const [first, ...below] = look.rows;
  const { delimiter, decimalComma } = look;
  const hasHeader = hints.hasHeader ?? !first.some((text) => isNumeric(text, decimalComma));
  const rows = (hasHeader ? below : look.rows).slice(0, ROWS_SHOWN);
  const names = Array.from({ length: hasHeader ? first.length : look.fieldCount }, (_, index) =>
    hasHeader && first[index] ? first[index] : `column ${index + 1}`,
  );
  const columns = names.map((name, index) => ({
    name,
    index,
    examples: rows.map((row) => row[index] ?? '').filter((text) => text !== '').slice(0, EXAMPLES_SHOWN),
  }));
  const mapping = mapColumnNames(hasHeader ? names : [], (index) => index);
  return { delimiter, hasHeader, decimalComma, columns, mapping: { ...mapping, delimiter, hasHeader, decimalComma }, rows };
};

const bestLook = (head: Uint8Array, hints: CsvHints): Look => {
  const candidates = hints.delimiter ? [hints.delimiter] : DELIMITERS;
  const looks = candidates.map((delimiter) => lookAt(head, delimiter, hints.decimalComma));
  return looks.reduce((best, look) => (isBetter(look, best) ? look : best));
};

/** Rows this regular may have a stray one among them. */
const REGULAR = 0.8;

/** Spaces also stand inside names and times, so they must win by more than what that adds. */
const SPACE_HANDICAP = 0.15;

const isBetter = (a: Look, b: Look): boolean => {
  const grade = ({ rows, fieldCount, regular }: Look): number =>
    fieldCount < 2 ? 0 : 1 + (regular >= REGULAR ? 2 : 0) + (rows[0].length === fieldCount ? 1 : 0);
  const numbers = ({ delimiter, numeric }: Look): number => numeric - (delimiter === ' ' ? SPACE_HANDICAP : 0);
  if (grade(a) !== grade(b)) return grade(a) > grade(b);
  if (Math.abs(numbers(a) - numbers(b)) > 0.01) return numbers(a) > numbers(b);
  return a.regular > b.regular;
};

const lookAt = (head: Uint8Array, delimiter: Delimiter, decimalCommaHint: boolean | undefined): Look => {
  const rows: string[][] = [];
  const splitter = createCsvSplitter(delimiter, (record) => {
    if (rows.length < ROWS_SNIFFED && record.problem === 'none') rows.push(fieldTexts(record));
  });
  splitter.push(head.subarray(0, SNIFF_BYTES));
  splitter.end();
  // the last row of a longer file may be cut
  if (head.length >= SNIFF_BYTES && rows.length > 1 && rows.length < ROWS_SNIFFED) rows.pop();

  const counts = new Map<number, number>();
  for (const row of rows) counts.set(row.length, (counts.get(row.length) ?? 0) + 1);
  let fieldCount = 0;
  let most = 0;
  for (const [length, count] of counts)
    if (count > most) {
      fieldCount = length;
      most = count;
    }
  const filled = rows.slice(1).flat().filter((text) => text !== '');
  const decimalComma = decimalCommaHint ?? (delimiter !== ',' && usesDecimalComma(rows.flat()));
  const numeric = filled.reduce((sum, text) => sum + (isNumeric(text, decimalComma) ? 1 : 0), 0);
  return {
    delimiter,
    rows,
    fieldCount,
    regular: rows.length > 0 ? most / rows.length : 0,
    numeric: filled.length > 0 ? numeric / filled.length : 0,
    decimalComma,
  };
};

const usesDecimalComma = (texts: string[]): boolean => {
  let commas = 0;
  let points = 0;
  for (const text of texts) {
    if (text.includes(',') && !Number.isNaN(parseNumber(text, true))) commas++;
    else if (text.includes('.') && !Number.isNaN(parseNumber(text))) points++;
  }
  return commas > points;
};

const isNumeric = (text: string, decimalComma: boolean): boolean =>
  !Number.isNaN(parseNumber(text, decimalComma)) ||
  !Number.isNaN(parseCoordinate(text, 'longitude', decimalComma)) ||
  !Number.isNaN(parseCoordinate(text, 'latitude', decimalComma)) ||
  !Number.isNaN(parseTime(text));

const oneColumn = (look: Look, hints: CsvHints): NumericalError => {
  const separator = hints.delimiter ? `no ${DELIMITER_WORDS[hints.delimiter]} separates them` : 'no comma, semicolon, tab, bar or space separates them';
  return new NumericalError(
    'COLUMN_MISSING',
    `Only one column was found: the rows look like "${look.rows[0][0].slice(0, 60)}" and ${separator}. ` +
      (hints.delimiter ? 'Choose another delimiter.' : 'Save the file with a comma between the columns, one row on each line.'),
    { details: { delimiter: hints.delimiter ?? null } },
  );
};

export const DELIMITER_WORDS: Record<Delimiter, string> = { ',': 'comma', ';': 'semicolon', '\t': 'tab', '|': 'bar', ' ': 'space' };

const decoder = new TextDecoder('utf-8');

/** Text of field k; bytes that are not UTF-8 become replacement characters. */
export const fieldText = (record: CsvRecord, k: number): string => {
  const start = record.fieldStart[k];
  const end = record.fieldEnd[k];
  const text =
    record.hasNonAscii || end - start > SHORT ? decoder.decode(record.bytes.subarray(start, end)) : asciiText(record.bytes, start, end);
  return record.hasDoubledQuote[k] ? text.replaceAll('""', '"') : text;
};

/** Up to this length building a string beats the decoder's call. */
const SHORT = 32;

const asciiText = (bytes: Uint8Array, start: number, end: number): string => {
  let text = '';
  for (let i = start; i < end; i++) text += String.fromCharCode(bytes[i]);
  return text;
};

const fieldTexts = (record: CsvRecord): string[] => Array.from({ length: record.fieldCount }, (_, k) => fieldText(record, k));
