import type { ObservationColumns } from '#core/design/observations.ts';

/** A column by its index from 0 (CSV), by its header (CSV) or by its property name (GeoJSON). */
export type ColumnChoice = number | string;

/** Everything of an observation beside its position; each may be mapped to a column. */
export const ATTRIBUTE_FIELDS = ['value', 'value2', 'errorSd', 'time', 'level', 'station', 'flag'] as const;
export type AttributeField = (typeof ATTRIBUTE_FIELDS)[number];

export type Delimiter = ',' | ';' | '\t' | '|' | ' ';

/** How a file's columns become an observation set. */
export interface Mapping extends Partial<Record<AttributeField, ColumnChoice>> {
  coordinates: 'lonlat' | 'plane';
  /** Longitude or x. Not needed for GeoJSON, whose geometry gives it. */
  x?: ColumnChoice;
  y?: ColumnChoice;
  /** Unit of projected x and y. */
  planeUnit: 'km' | 'm';
  /** CSV only; absent: detected. A space stands for any run of spaces and tabs. */
  delimiter?: Delimiter;
  hasHeader?: boolean;
  decimalComma?: boolean;
}

/** A row that is not in the observation set, and what to do about it. */
export interface RejectedRow {
  /** Line on which the row starts, from 1 (GeoJSON: number of the feature). */
  line: number;
  /** Column name, or "row" where the whole row is at fault. */
  field: string;
  /** The text found, cut to 200 characters. */
  found: string;
  reason: string;
}

export interface ReadOptions {
  /** After each piece of the file: how much of it has been read. */
  onProgress?: (progress: { bytes: number; rows: number }) => void;
  isCancelled?: () => boolean;
  /** How many rejected rows the result holds, from the first; 1,000 by default. The count is exact whatever this is. */
  maxRejectedKept?: number;
  /** Every rejected row, in order, in batches of at most 1,000; reading goes on when the promise settles. */
  onRejected?: (batch: RejectedRow[]) => void | Promise<void>;
  /** Most rows that may be accepted; 2,000,000 by default. */
  maxRows?: number;
}

/** rowsRead = rows in `columns` + rejectedCount. Exact duplicates are rows like any other. */
export interface ReadResult {
  columns: ObservationColumns;
  /** The mapping that was used, with what was detected filled in. */
  mapping: Mapping;
  rowsRead: number;
  rejected: RejectedRow[];
  rejectedCount: number;
}
