import { Op, type WhereOptions } from 'sequelize';

import type { List } from '#schemas/list.ts';
import { idSchema } from '#schemas/list.ts';

import { AppError, notFound } from './errors.ts';

interface Cursor {
  at: string;
  id: string;
}

const encode = (cursor: Cursor): string => Buffer.from(JSON.stringify(cursor)).toString('base64url');

const decode = (text: string): Cursor => {
  try {
    const value = JSON.parse(Buffer.from(text, 'base64url').toString()) as Partial<Cursor>;
    if (typeof value.at === 'string' && !Number.isNaN(Date.parse(value.at)) && idSchema.safeParse(value.id).success) return value as Cursor;
  } catch {
    // falls through to the answer below
  }
  throw new AppError('CURSOR_INVALID', 'The cursor is not one that this list gave. Start again without it.');
};

/** Condition for the rows after a cursor in a list sorted by `column` descending, then `id`. Times count in milliseconds. */
export const afterCursor = (cursor: string | undefined, column: string): WhereOptions => {
  if (cursor === undefined) return {};
  const { at, id } = decode(cursor);
  return { [Op.or]: [{ [column]: { [Op.lt]: new Date(at) } }, { [column]: new Date(at), id: { [Op.gt]: id } }] } as WhereOptions;
};

/** A page of `rows`, of which one more than `limit` was asked for to learn whether there is a next page. */
export const pageOf = <Row extends { id: string }, T>(rows: Row[], limit: number, at: (row: Row) => Date, present: (row: Row) => T): List<T> => {
  const shown = rows.slice(0, limit);
  const last = shown.at(-1);
  return {
    items: shown.map(present),
    nextCursor: rows.length > limit && last ? encode({ at: at(last).toISOString(), id: last.id }) : null,
  };
};

/** `id` when it is a UUID: anything else cannot name a row. @throws AppError NOT_FOUND */
export const requireId = (id: string | undefined, what: string): string => {
  if (id === undefined || !idSchema.safeParse(id).success) throw notFound(what);
  return id;
};
