import { NumericalError } from '#core/errors.ts';

import { createCsvSplitter } from './csv-records.ts';
import type { CsvProblem, CsvRecord } from './csv-records.ts';
import { DELIMITER_WORDS, fieldText, SNIFF_BYTES, sniffCsv } from './csv-sniff.ts';
import type { CsvSniff } from './csv-sniff.ts';
import type { ColumnChoice, Mapping, ReadOptions, ReadResult } from './mapping.ts';
import { ATTRIBUTE_FIELDS } from './mapping.ts';
import type { NumberField, ObservationRows } from './observation-rows.ts';
import { createObservationRows, explainLabel, LABEL_FIELDS, NUMBER_FIELDS, tidyLabel } from './observation-rows.ts';
import { explainCoordinate, parseCoordinate, placeDegrees } from './parse-coordinate.ts';
import type { Axis } from './parse-coordinate.ts';
import { explainNumber, parseNumberBytes } from './parse-number.ts';
import { explainTime, parseTimeBytes } from './parse-time.ts';

export { sniffCsv } from './csv-sniff.ts';
export type { CsvHints, CsvSniff } from './csv-sniff.ts';

/** Large pieces are read in slices of this size, so that progress, cancelling and batches keep their pace. */
const SLICE = 2 ** 20;

/**
 * The observations of a delimited text file, read piece by piece in bounded memory. What the mapping leaves open is
 * detected from the first bytes (`sniffCsv`); without a mapping the header must tell the coordinates. Each row is
 * either in the columns or rejected with its line, field, text and reason; exact duplicates are rows like any other.
 * Longitudes are brought into [-180, 180), x and y into km, times into Unix seconds.
 * @throws NumericalError FILE_EMPTY, FILE_TOO_LARGE, COLUMN_MISSING, NO_ROW_ACCEPTED, CANCELLED.
 */
export const readCsvObservations = async (
  chunks: Iterable<Uint8Array> | AsyncIterable<Uint8Array>,
  mapping: Mapping | undefined,
  options: ReadOptions = {},
): Promise<ReadResult> => {
  const slices = sliceChunks(chunks);
  const { head, whole } = await takeHead(slices);
  const sniff = sniffCsv(head, mapping);
  const used = completeMapping(mapping, sniff);
  const rows = createObservationRows(used, options);
  const readRow = createRowReader(used, sniff, rows);
  const splitter = createCsvSplitter(used.delimiter ?? ',', readRow);

  let bytes = 0;
  const advance = async (slice: Uint8Array): Promise<void> => {
    if (options.isCancelled?.()) throw new NumericalError('CANCELLED', 'Reading the file was cancelled. Nothing was kept.');
    splitter.push(slice);
    bytes += slice.length;
    await rows.flush(false);
    options.onProgress?.({ bytes, rows: rows.rowsRead() });
  };
  for (const slice of whole) await advance(slice);
  for (let next = await slices.next(); !next.done; next = await slices.next()) await advance(next.value);
  splitter.end();
  await rows.flush(true);
  options.onProgress?.({ bytes, rows: rows.rowsRead() });
  return rows.finish();
};

async function* sliceChunks(chunks: Iterable<Uint8Array> | AsyncIterable<Uint8Array>): AsyncGenerator<Uint8Array, undefined> {
  for await (const chunk of chunks)
    for (let at = 0; at < chunk.length; at += SLICE) yield chunk.subarray(at, at + SLICE);
  return undefined;
}

/** The first slices until there is enough to sniff, and their bytes in one. */
const takeHead = async (slices: AsyncGenerator<Uint8Array, undefined>): Promise<{ head: Uint8Array; whole: Uint8Array[] }> => {
  const whole: Uint8Array[] = [];
  let length = 0;
  while (length < SNIFF_BYTES) {
    const next = await slices.next();
    if (next.done) break;
    whole.push(next.value);
    length += next.value.length;
  }
  const head = new Uint8Array(length);
  let at = 0;
  for (const slice of whole) {
    head.set(slice, at);
    at += slice.length;
  }
  return { head, whole };
};

/** The mapping with columns as indices and what was left open filled in. */
const completeMapping = (mapping: Mapping | undefined, sniff: CsvSniff): Mapping => {
  const { delimiter, hasHeader, decimalComma } = sniff;
  if (!mapping) {
    if (sniff.mapping.x === undefined) throw noCoordinates(sniff);
    return sniff.mapping;
  }
  const used: Mapping = {
    coordinates: mapping.coordinates,
    planeUnit: mapping.planeUnit,
    x: findColumn(mapping.x, coordinateName(mapping, 'x'), sniff),
    y: findColumn(mapping.y, coordinateName(mapping, 'y'), sniff),
    delimiter,
    hasHeader,
    decimalComma,
  };
  for (const field of ATTRIBUTE_FIELDS) if (mapping[field] !== undefined) used[field] = findColumn(mapping[field], field, sniff);
  return used;
};

const coordinateName = ({ coordinates }: Mapping, which: 'x' | 'y'): string =>
  coordinates === 'plane' ? which : which === 'x' ? 'longitude' : 'latitude';

const listColumns = ({ columns }: CsvSniff): string => {
  const names = columns.slice(0, 12).map(({ name }) => name.slice(0, 40));
  return names.join(', ') + (columns.length > names.length ? ` and ${columns.length - names.length} more` : '');
};

const noCoordinates = (sniff: CsvSniff): NumericalError =>
  new NumericalError(
    'COLUMN_MISSING',
    sniff.hasHeader
      ? `No pair of columns is named like longitude and latitude, or x and y. The columns are: ${listColumns(sniff)}. Choose the two in the mapping.`
      : `The file has no header (its first row holds numbers), so the ${sniff.columns.length} columns cannot be told apart. Choose them in the mapping.`,
    { details: { columns: sniff.columns.map(({ name }) => name) } },
  );

const findColumn = (choice: ColumnChoice | undefined, field: string, sniff: CsvSniff): number => {
  const missing = (what: string): NumericalError =>
    new NumericalError('COLUMN_MISSING', `${what} The columns are: ${listColumns(sniff)}.`, { details: { field, column: choice ?? null } });
  if (choice === undefined) throw missing(`No column is chosen for ${field}. Choose one.`);
  if (typeof choice === 'number') {
    if (choice < sniff.columns.length) return choice;
    throw missing(`Column ${choice + 1} is chosen for ${field}, but the file has ${sniff.columns.length} columns.`);
  }
  const wanted = choice.trim().toLowerCase();
  const found = sniff.columns.find(({ name }) => name.trim().toLowerCase() === wanted);
  if (!found) throw missing(`No column is named "${choice}", which is chosen for ${field}.`);
  return found.index;
};

const PROBLEM_REASONS: Record<Exclude<CsvProblem, 'none'>, string> = {
  'text-after-quote': 'There is text after a closing quote. Write a quote inside a quoted field twice, or remove the quotes.',
  'quote-not-closed': 'A quote is opened and never closed. Close it, or write a quote inside a quoted field twice.',
  'row-too-long': 'The row is longer than 262,144 bytes. Check the line ends and quotes of the file.',
  'too-many-fields': 'The row has more than 10,000 fields. Check the line ends of the file.',
};

/** A function that turns one row into an accepted or a rejected one. */
const createRowReader = (mapping: Mapping, sniff: CsvSniff, rows: ObservationRows): ((record: CsvRecord) => void) => {
  const { delimiter = ',', hasHeader, decimalComma = false } = mapping;
  const isPlane = mapping.coordinates === 'plane';
  const kmPerUnit = mapping.planeUnit === 'm' ? 1000 : 1;
  const columnX = mapping.x as number;
  const columnY = mapping.y as number;
  const numberColumns = NUMBER_FIELDS.map((field) => mapping[field] as number | undefined);
  const labelColumns = LABEL_FIELDS.map((field) => mapping[field] as number | undefined);
  const fieldCount = sniff.columns.length;
  const numbers = new Float64Array(NUMBER_FIELDS.length);
  const labels = LABEL_FIELDS.map(() => '');
  const strict = new TextDecoder('utf-8', { fatal: true });
  const loose = new TextDecoder('utf-8');
  let isHeaderAhead = hasHeader ?? false;

  const isUtf8 = (bytes: Uint8Array): boolean => {
    try {
      strict.decode(bytes);
      return true;
    } catch {
      return false;
    }
  };
  const rejectField = (record: CsvRecord, column: number, reason: string): void =>
    rows.reject(record.line, sniff.columns[column].name, fieldText(record, column), reason);
  const rejectRow = (record: CsvRecord, reason: string): void =>
    rows.reject(record.line, 'row', loose.decode(record.bytes.subarray(record.start, Math.min(record.end, record.start + 800))), reason);

  /** x or y in the set's coordinates; NaN, with the row rejected, where the field does not give it. */
  const readPosition = (record: CsvRecord, column: number, axis: Axis): number => {
    const start = record.fieldStart[column];
    const end = record.fieldEnd[column];
    if (start === end) {
      rejectField(record, column, 'The coordinate is missing. Fill it in, or remove the row.');
      return NaN;
    }
    const number = parseNumberBytes(record.bytes, start, end, decimalComma);
    if (isPlane) {
      if (Number.isNaN(number)) rejectField(record, column, explainNumber(fieldText(record, column), decimalComma));
      return number / kmPerUnit + 0;
    }
    const degrees = Number.isNaN(number) ? parseCoordinate(fieldText(record, column), axis, decimalComma) : placeDegrees(number, axis);
    if (Number.isNaN(degrees)) rejectField(record, column, explainCoordinate(fieldText(record, column), axis, decimalComma));
    return degrees;
  };

  /** Whether the field was empty or good; its number is in `numbers`. */
  const readNumber = (record: CsvRecord, k: number, field: NumberField): boolean => {
    numbers[k] = NaN;
    const column = numberColumns[k];
    if (column === undefined || record.fieldStart[column] === record.fieldEnd[column]) return true;
    if (field === 'time') {
      numbers[k] = parseTimeBytes(record.bytes, record.fieldStart[column], record.fieldEnd[column], () => fieldText(record, column));
      if (Number.isNaN(numbers[k])) rejectField(record, column, explainTime(fieldText(record, column)));
    } else {
      numbers[k] = parseNumberBytes(record.bytes, record.fieldStart[column], record.fieldEnd[column], decimalComma);
      if (Number.isNaN(numbers[k])) rejectField(record, column, explainNumber(fieldText(record, column), decimalComma));
      else if (field === 'errorSd' && numbers[k] <= 0) {
        rejectField(record, column, NOT_POSITIVE);
        return false;
      }
    }
    return !Number.isNaN(numbers[k]);
  };

  const readLabel = (record: CsvRecord, k: number): boolean => {
    const column = labelColumns[k];
    labels[k] = column === undefined ? '' : tidyLabel(fieldText(record, column));
    const reason = column === undefined ? null : explainLabel(labels[k]);
    if (column !== undefined && reason) rejectField(record, column, reason);
    return reason === null;
  };

  const checkShape = (record: CsvRecord): boolean => {
    if (record.problem !== 'none') rejectRow(record, PROBLEM_REASONS[record.problem]);
    else if (record.hasNonAscii && !isUtf8(record.bytes.subarray(record.start, record.end))) {
      for (let k = 0; k < record.fieldCount; k++) {
        if (isUtf8(record.bytes.subarray(record.fieldStart[k], record.fieldEnd[k]))) continue;
        const field = sniff.columns[k]?.name ?? 'row';
        rows.reject(record.line, field, fieldText(record, k), NOT_UTF8);
        return false;
      }
      rejectRow(record, NOT_UTF8);
    } else if (record.fieldCount !== fieldCount)
      rejectRow(
        record,
        `The row has ${record.fieldCount} fields where ${fieldCount} are expected. ` +
          (record.fieldCount > fieldCount
            ? `Put a field that holds a ${DELIMITER_WORDS[delimiter]} in double quotes, or remove the extra ones.`
            : `Write an empty field for a value that is not given.`),
      );
    else return true;
    return false;
  };

  return (record) => {
    if (isHeaderAhead) {
      isHeaderAhead = false;
      return;
    }
    if (!checkShape(record)) return;
    const x = readPosition(record, columnX, 'longitude');
    if (Number.isNaN(x)) return;
    const y = readPosition(record, columnY, 'latitude');
    if (Number.isNaN(y)) return;
    for (let k = 0; k < NUMBER_FIELDS.length; k++) if (!readNumber(record, k, NUMBER_FIELDS[k])) return;
    for (let k = 0; k < labels.length; k++) if (!readLabel(record, k)) return;
    rows.accept(record.line, x, y, numbers, labels);
  };
};

export const NOT_POSITIVE = 'An error standard deviation must be above 0. Correct it, or leave the cell empty.';
const NOT_UTF8 = 'The text is not valid UTF-8. Save the file with UTF-8 encoding.';

