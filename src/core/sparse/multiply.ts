import { NumericalError } from '#core/errors.ts';
import type { SparseMatrix } from './matrix.ts';

/** y = A x; `out` is overwritten when given. */
export function multiplyVector(a: SparseMatrix, x: Float64Array, out = new Float64Array(a.rows)): Float64Array {
  if (x.length !== a.columns)
    throw new NumericalError('INPUT_LENGTH_MISMATCH', `The vector has ${x.length} values and the matrix ${a.columns} columns.`, { details: { length: x.length, columns: a.columns } });
  out.fill(0);
  for (let j = 0; j < a.columns; j++) {
    const xj = x[j];
    for (let p = a.colPtr[j]; p < a.colPtr[j + 1]; p++) out[a.rowIdx[p]] += a.values[p] * xj;
  }
  return out;
}
