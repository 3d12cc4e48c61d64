/**
 * A sparse matrix in compressed columns (Davis 2006, section 2.1): the entries of column j are
 * `rowIdx[p]`, `values[p]` for p in `colPtr[j]` .. `colPtr[j + 1] - 1`, rows ascending, none twice.
 */
export interface SparseMatrix {
  rows: number;
  columns: number;
  colPtr: Uint32Array;
  rowIdx: Uint32Array;
  values: Float64Array;
}

/** Stored entries, explicit zeros included. */
export const nonZeroCount = (a: SparseMatrix): number => a.rowIdx.length;

/** A_ij, 0 outside the pattern. */
export function entryAt(a: SparseMatrix, row: number, column: number): number {
  let low = a.colPtr[column];
  let high = a.colPtr[column + 1] - 1;
  while (low <= high) {
    const middle = (low + high) >> 1;
    const at = a.rowIdx[middle];
    if (at === row) return a.values[middle];
    if (at < row) low = middle + 1;
    else high = middle - 1;
  }
  return 0;
}

/** The main diagonal, one value per column of a square matrix. */
export function diagonalOf(a: SparseMatrix): Float64Array {
  return Float64Array.from({ length: Math.min(a.rows, a.columns) }, (_, j) => entryAt(a, j, j));
}
