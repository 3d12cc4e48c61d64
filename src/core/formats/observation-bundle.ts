import type { LabelColumn, ObservationColumns } from '#core/design/observations.ts';
import { NumericalError } from '#core/errors.ts';

import { packArrays, unpackArrays } from './array-bundle.ts';
import type { TypedArray } from './array-bundle.ts';

const NUMBER_COLUMNS = ['value', 'value2', 'errorSd', 'time', 'level'] as const;
const LABEL_COLUMNS = ['station', 'flag'] as const;

interface Meta {
  kind: 'observations';
  crs: ObservationColumns['crs'];
  /** Labels of the label columns that there are. */
  names: Partial<Record<(typeof LABEL_COLUMNS)[number], string[]>>;
}

/** The columns of an observation set as one array bundle: little-endian, the same bytes for the same columns. */
export const packObservations = (columns: ObservationColumns): Uint8Array => {
  const meta: Meta = { kind: 'observations', crs: columns.crs, names: {} };
  const arrays: Record<string, TypedArray> = { x: columns.x, y: columns.y, line: columns.line };
  for (const name of NUMBER_COLUMNS) {
    const column = columns[name];
    if (column) arrays[name] = column;
  }
  for (const name of LABEL_COLUMNS) {
    const column = columns[name];
    if (!column) continue;
    meta.names[name] = column.names;
    arrays[name] = column.codes;
  }
  return packArrays(meta, arrays);
};

const malformed = (what: string): NumericalError =>
  new NumericalError(
    'FILE_MALFORMED',
    `These bytes are not the columns of an observation set: ${what}. Upload the original file again.`,
    { details: { what } },
  );

/**
 * What `packObservations` packed, checked: equal lengths, finite coordinates, labels that exist.
 * @throws NumericalError FILE_MALFORMED naming the column at fault.
 */
export const unpackObservations = (bytes: Uint8Array): ObservationColumns => {
  const { meta, arrays } = unpackArrays(bytes);
  const { kind, crs, names } = (meta ?? {}) as Partial<Meta>;
  if (kind !== 'observations' || !names) throw malformed('they hold something else');
  if (crs !== 'lonlat-deg' && crs !== 'plane-km') throw malformed('the coordinate reference is unknown');
  const { x, y, line } = arrays;
  if (!(x instanceof Float64Array) || !(y instanceof Float64Array) || !(line instanceof Uint32Array))
    throw malformed('x, y or line is missing');
  const count = x.length;
  for (const [name, array] of Object.entries(arrays))
    if (array.length !== count) throw malformed(`column "${name}" has ${array.length} rows where x has ${count}`);
  if (!x.every(Number.isFinite) || !y.every(Number.isFinite)) throw malformed('a coordinate is not a finite number');

  const columns: ObservationColumns = { crs, x, y, line };
  for (const name of NUMBER_COLUMNS) {
    const column = arrays[name];
    if (column === undefined) continue;
    if (!(column instanceof Float64Array)) throw malformed(`column "${name}" is not made of float64`);
    columns[name] = column;
  }
  for (const name of LABEL_COLUMNS) {
    const codes = arrays[name];
    if (codes !== undefined) columns[name] = labelColumn(name, names[name], codes);
  }
  return columns;
};

const labelColumn = (name: string, names: unknown, codes: TypedArray): LabelColumn => {
  const isList = Array.isArray(names) && names.every((label) => typeof label === 'string');
  if (!isList || !(codes instanceof Uint32Array)) throw malformed(`column "${name}" has no list of labels`);
  if (!codes.every((code) => code < names.length)) throw malformed(`column "${name}" points to a label that is not there`);
  return { names, codes };
};
