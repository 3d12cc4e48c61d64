import type { LabelColumn, ObservationColumns } from '#core/design/observations.ts';
import { NumericalError } from '#core/errors.ts';

import type { AttributeField, Mapping, ReadOptions, ReadResult, RejectedRow } from './mapping.ts';

const DEFAULT_REJECTED_KEPT = 1000;
const DEFAULT_MAX_ROWS = 2_000_000;
const BATCH = 1000;
const LONGEST_FOUND = 200;
export const LONGEST_LABEL = 200;

/** Where readers put what they read, row by row, and what becomes the result. */
export interface ObservationRows {
  /** A row of the set; numbers may be NaN and labels empty where not given. */
  accept(line: number, x: number, y: number, numbers: Float64Array, labels: string[]): void;
  reject(line: number, field: string, found: string, reason: string): void;
  rowsRead(): number;
  /** Hands full batches of rejected rows over (all rows with `isLast`). */
  flush(isLast: boolean): Promise<void>;
  /** @throws NumericalError NO_ROW_ACCEPTED with the first rejected rows. */
  finish(): ReadResult;
}

/** Places in `numbers` and `labels` of `ObservationRows.accept`. */
export const NUMBER_FIELDS = ['value', 'value2', 'errorSd', 'time', 'level'] as const;
export const LABEL_FIELDS = ['station', 'flag'] as const;
export type NumberField = (typeof NUMBER_FIELDS)[number];
export type LabelField = (typeof LABEL_FIELDS)[number];

export const isMapped = (mapping: Mapping, field: AttributeField): boolean => mapping[field] !== undefined;

/** A Float64Array that grows. */
const createColumn = () => {
  let values = new Float64Array(1024);
  let length = 0;
  return {
    push(value: number): void {
      if (length === values.length) {
        const longer = new Float64Array(2 * length);
        longer.set(values);
        values = longer;
      }
      values[length++] = value;
    },
    take: (): Float64Array => values.slice(0, length),
  };
};

const createLabels = () => {
  const codeOf = new Map<string, number>();
  const codes = createColumn();
  return {
    push(label: string): void {
      let code = codeOf.get(label);
      if (code === undefined) {
        code = codeOf.size;
        codeOf.set(label, code);
      }
      codes.push(code);
    },
    take: (): LabelColumn => ({ names: [...codeOf.keys()], codes: Uint32Array.from(codes.take()) }),
  };
};

const LONE_SURROGATE = /[\ud800-\udbff](?![\udc00-\udfff])|(?<![\ud800-\udbff])[\udc00-\udfff]/g;
// eslint-disable-next-line no-control-regex
const CONTROL = /[\u0000-\u001f\u007f]/g;
// eslint-disable-next-line no-control-regex
const SUSPECT = /[\u0000-\u001f\u007f\ud800-\udfff]/;

/** Cut, with control characters and halves of surrogate pairs made visible, so that any database can hold it. */
export const showText = (text: string): string =>
  text
    .slice(0, LONGEST_FOUND)
    .replace(CONTROL, (c) => (c === '\u007f' ? '\u2421' : String.fromCharCode(0x2400 + c.charCodeAt(0))))
    .replace(LONE_SURROGATE, '\ufffd');

/** A label on one line: line ends and tabs, which quoted fields may hold, become spaces. */
export const tidyLabel = (text: string): string => (SUSPECT.test(text) ? text.replace(/\s*[\t\n\r]\s*/g, ' ').trim() : text);

/** Why a tidy label cannot be kept; null when it can. */
export const explainLabel = (label: string): string | null => {
  if (label.length > LONGEST_LABEL) return `This label has more than ${LONGEST_LABEL} characters. Shorten it.`;
  if (SUSPECT.test(label) && showText(label) !== label)
    return 'This label holds a control character or half a character. Remove it.';
  return null;
};

/** Empty columns for what the mapping maps. */
export const createObservationRows = (mapping: Mapping, options: ReadOptions): ObservationRows => {
  const { maxRejectedKept = DEFAULT_REJECTED_KEPT, maxRows = DEFAULT_MAX_ROWS, onRejected } = options;
  const x = createColumn();
  const y = createColumn();
  const lines = createColumn();
  const numberColumns = NUMBER_FIELDS.map((field) => (isMapped(mapping, field) ? createColumn() : null));
  const labelColumns = LABEL_FIELDS.map((field) => (isMapped(mapping, field) ? createLabels() : null));
  const rejected: RejectedRow[] = [];
  let batch: RejectedRow[] = [];
  let accepted = 0;
  let rejectedCount = 0;

  const finishColumns = (): ObservationColumns => {
    const columns: ObservationColumns = {
      crs: mapping.coordinates === 'lonlat' ? 'lonlat-deg' : 'plane-km',
      x: x.take(),
      y: y.take(),
      line: Uint32Array.from(lines.take()),
    };
    for (const [k, field] of NUMBER_FIELDS.entries()) {
      const column = numberColumns[k];
      if (column) columns[field] = column.take();
    }
    for (const [k, field] of LABEL_FIELDS.entries()) {
      const column = labelColumns[k];
      if (column) columns[field] = column.take();
    }
    return columns;
  };

  return {
    accept(line, px, py, numbers, labels) {
      if (accepted === maxRows)
        throw new NumericalError(
          'FILE_TOO_LARGE',
          `The file has more than ${groupDigits(maxRows)} usable rows (reached at line ${line}). Split it, or thin it before the upload.`,
          { details: { maxRows, line } },
        );
      accepted++;
      x.push(px);
      y.push(py);
      lines.push(line);
      for (let k = 0; k < numberColumns.length; k++) numberColumns[k]?.push(numbers[k]);
      for (let k = 0; k < labelColumns.length; k++) labelColumns[k]?.push(labels[k]);
    },
    reject(line, field, found, reason) {
      rejectedCount++;
      const isKept = rejected.length < maxRejectedKept;
      if (!isKept && !onRejected) return;
      const row: RejectedRow = { line, field: showText(field), found: showText(found), reason };
      if (isKept) rejected.push(row);
      if (onRejected) batch.push(row);
    },
    rowsRead: () => accepted + rejectedCount,
    async flush(isLast) {
      if (!onRejected) return;
      const pending = batch;
      batch = [];
      let at = 0;
      for (; pending.length - at >= BATCH; at += BATCH) await onRejected(pending.slice(at, at + BATCH));
      const rest = pending.slice(at);
      if (isLast && rest.length > 0) await onRejected(rest);
      else batch = rest;
    },
    finish() {
      if (accepted === 0) throw noRowAccepted(rejected, rejectedCount);
      return { columns: finishColumns(), mapping, rowsRead: accepted + rejectedCount, rejected, rejectedCount };
    },
  };
};

const noRowAccepted = (rejected: RejectedRow[], rejectedCount: number): NumericalError => {
  const [first] = rejected;
  const what =
    rejectedCount === 0
      ? 'The file has no rows of data. Add rows below the header.'
      : `None of the ${rejectedCount} rows can be used.` +
        (first ? ` The first is on line ${first.line}, ${first.field}: "${first.found.slice(0, 60)}". ${first.reason}` : '');
  return new NumericalError('NO_ROW_ACCEPTED', what, { details: { rowsRead: rejectedCount, rejectedCount, rejected: rejected.slice(0, 20) } });
};

const groupDigits = (count: number): string => String(count).replace(/\B(?=(\d{3})+$)/g, ',');
