import { NumericalError } from '#core/errors.ts';
import type { SparseMatrix } from './matrix.ts';

/** Entries (rowIdx[k], colIdx[k], values[k]) in any order. */
export interface Triplets {
  rows: number;
  columns: number;
  rowIdx: ArrayLike<number>;
  colIdx: ArrayLike<number>;
  values: ArrayLike<number>;
}

/** Compressed columns from triplets; entries at the same place are summed. Two counting sorts, O(nnz + n). */
export function fromTriplets(t: Triplets): SparseMatrix {
  checkTriplets(t);
  const count = t.values.length;
  const byRow = countingSort(t.rowIdx, t.rows, count);
  const colPtr = new Uint32Array(t.columns + 1);
  for (let k = 0; k < count; k++) colPtr[t.colIdx[k] + 1]++;
  for (let j = 0; j < t.columns; j++) colPtr[j + 1] += colPtr[j];
  const next = colPtr.slice(0, t.columns);
  const rowIdx = new Uint32Array(count);
  const values = new Float64Array(count);
  const start = colPtr.slice();
  // rows come in ascending order, so an equal row is always the last one placed
  for (const k of byRow) {
    const column = t.colIdx[k];
    const end = next[column];
    if (end > start[column] && rowIdx[end - 1] === t.rowIdx[k]) values[end - 1] += t.values[k];
    else {
      rowIdx[end] = t.rowIdx[k];
      values[end] = t.values[k];
      next[column]++;
    }
  }
  return compact(t, colPtr, next, rowIdx, values);
}

function countingSort(keys: ArrayLike<number>, bound: number, count: number): Uint32Array {
  const start = new Uint32Array(bound + 1);
  for (let k = 0; k < count; k++) start[keys[k] + 1]++;
  for (let i = 0; i < bound; i++) start[i + 1] += start[i];
  const order = new Uint32Array(count);
  for (let k = 0; k < count; k++) order[start[keys[k]]++] = k;
  return order;
}

function compact(t: Triplets, from: Uint32Array, end: Uint32Array, rowIdx: Uint32Array, values: Float64Array): SparseMatrix {
  const colPtr = new Uint32Array(t.columns + 1);
  let kept = 0;
  for (let j = 0; j < t.columns; j++) {
    for (let p = from[j]; p < end[j]; p++, kept++) {
      rowIdx[kept] = rowIdx[p];
      values[kept] = values[p];
    }
    colPtr[j + 1] = kept;
  }
  return { rows: t.rows, columns: t.columns, colPtr, rowIdx: rowIdx.slice(0, kept), values: values.slice(0, kept) };
}

function checkTriplets(t: Triplets): void {
  if (t.rowIdx.length !== t.values.length || t.colIdx.length !== t.values.length)
    throw new NumericalError('INPUT_LENGTH_MISMATCH', 'Rows, columns and values of the triplets differ in length. Give one of each per entry.', {
      details: { rows: t.rowIdx.length, columns: t.colIdx.length, values: t.values.length },
    });
  for (let k = 0; k < t.values.length; k++) {
    if (!(t.rowIdx[k] >= 0 && t.rowIdx[k] < t.rows && t.colIdx[k] >= 0 && t.colIdx[k] < t.columns))
      throw new NumericalError('INDEX_OUT_OF_RANGE', `Triplet ${k} lies at row ${t.rowIdx[k]}, column ${t.colIdx[k]}, outside the ${t.rows} x ${t.columns} matrix.`, { details: { triplet: k } });
    if (!Number.isFinite(t.values[k]))
      throw new NumericalError('INPUT_NOT_FINITE', `The value of triplet ${k} is not a finite number.`, { details: { triplet: k } });
  }
}
