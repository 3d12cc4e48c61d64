import type { z } from 'zod/v4';

import type { ObservationColumns } from '#core/design/observations.ts';
import { unpackObservations } from '#core/formats/observation-bundle.ts';
import { ObservationSetRow } from '#db/models/ObservationSetRow.ts';
import type { ObservationPoint, PointsPage, pointsQuerySchema } from '#schemas/observation-sets.ts';

import type { Context } from '../context.ts';
import { notFound } from '../errors.ts';
import { loadObservationSet } from './observations.ts';

type Query = z.output<typeof pointsQuerySchema>;

/** Sets whose columns are kept unpacked; a set never changes, so nothing goes stale. */
const KEPT_SETS = 4;
const kept = new Map<string, { columns: ObservationColumns; orders: Map<string, Uint32Array> }>();

const unpacked = async (setId: string): Promise<{ columns: ObservationColumns; orders: Map<string, Uint32Array> }> => {
  const known = kept.get(setId);
  kept.delete(setId);
  const row = known ? null : await ObservationSetRow.findByPk(setId, { attributes: ['id', 'columnsBundle'] });
  if (!known && !row) throw notFound('observation set');
  const entry = known ?? { columns: unpackObservations(row!.columnsBundle), orders: new Map() };
  kept.set(setId, entry);
  while (kept.size > KEPT_SETS) kept.delete(kept.keys().next().value!);
  return entry;
};

const labelAt = (columns: ObservationColumns, name: 'station' | 'flag', i: number): string => {
  const column = columns[name];
  return column ? column.names[column.codes[i]] : '';
};

/** Rows sorted by a column; rows without a value come last in either direction. */
const sortedRows = (columns: ObservationColumns, orders: Map<string, Uint32Array>, sort: Query['sort']): Uint32Array => {
  const done = orders.get(sort);
  if (done) return done;
  const rows = Uint32Array.from({ length: columns.x.length }, (_, i) => i);
  if (sort === 'station' || sort === 'flag') {
    const rank = new Map([...new Set(columns[sort]?.names ?? [])].sort().map((name, k) => [name, k]));
    const keys = Float64Array.from(rows, (i) => rank.get(labelAt(columns, sort, i)) ?? 0);
    rows.sort((a, b) => keys[a] - keys[b] || a - b);
  } else if (sort !== 'index') {
    const column = columns[sort];
    if (column) rows.sort((a, b) => compare(column[a], column[b]) || a - b);
  }
  orders.set(sort, rows);
  return rows;
};

const compare = (a: number, b: number): number => (Number.isNaN(a) ? (Number.isNaN(b) ? 0 : 1) : Number.isNaN(b) ? -1 : a - b);

/** A page of the set's observations, sorted and filtered. */
export const listPoints = async (ctx: Context, setId: string | undefined, query: Query): Promise<PointsPage> => {
  const set = await loadObservationSet(ctx, setId, 'observations.read');
  const { columns, orders } = await unpacked(set.id);
  let rows: Uint32Array | number[] = sortedRows(columns, orders, query.sort);
  const { search, flag } = query;
  if (search !== undefined || flag !== undefined) {
    const wanted = search?.toLowerCase() ?? '';
    rows = rows.filter(
      (i) =>
        (flag === undefined || labelAt(columns, 'flag', i) === flag) &&
        (wanted === '' ||
          labelAt(columns, 'station', i).toLowerCase().includes(wanted) ||
          labelAt(columns, 'flag', i).toLowerCase().includes(wanted) ||
          String(columns.line[i]).includes(wanted)),
    );
  }
  if (query.order === 'desc') rows = reversedKeepingBlanksLast(rows, columns, query.sort);
  const items = Array.from(rows.slice(query.offset, query.offset + query.limit), (i) => present(columns, i));
  const next = query.offset + items.length;
  return { items, total: rows.length, nextCursor: next < rows.length ? String(next) : null };
};

const reversedKeepingBlanksLast = (rows: Uint32Array | number[], columns: ObservationColumns, sort: Query['sort']): number[] => {
  const list = Array.from(rows);
  const column = sort === 'index' || sort === 'station' || sort === 'flag' ? undefined : columns[sort];
  const firstBlank = column ? list.findIndex((i) => Number.isNaN(column[i])) : -1;
  return firstBlank < 0 ? list.reverse() : [...list.slice(0, firstBlank).reverse(), ...list.slice(firstBlank)];
};

const present = (columns: ObservationColumns, i: number): ObservationPoint => {
  const number = (column: Float64Array | undefined): number | null => (column && !Number.isNaN(column[i]) ? column[i] : null);
  return {
    index: i,
    line: columns.line[i],
    x: columns.x[i],
    y: columns.y[i],
    value: number(columns.value),
    value2: number(columns.value2),
    errorSd: number(columns.errorSd),
    time: number(columns.time),
    level: number(columns.level),
    station: labelAt(columns, 'station', i) || null,
    flag: labelAt(columns, 'flag', i) || null,
  };
};
