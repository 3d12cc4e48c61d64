import { NumericalError } from '#core/errors.ts';
import type { SparseMatrix } from '#core/sparse/matrix.ts';

const PIECE = 20_000;

const encodeLines = function* (lines: Iterable<string>): Generator<Uint8Array> {
  const encoder = new TextEncoder();
  let held: string[] = [];
  for (const line of lines) {
    held.push(line);
    if (held.length < PIECE) continue;
    yield encoder.encode(held.join(''));
    held = [];
  }
  yield encoder.encode(held.join(''));
};

const joined = (parts: Uint8Array[]): Uint8Array => {
  const bytes = new Uint8Array(parts.reduce((sum, part) => sum + part.length, 0));
  let at = 0;
  for (const part of parts) {
    bytes.set(part, at);
    at += part.length;
  }
  return bytes;
};

/**
 * A symmetric matrix in Matrix Market coordinate format (Boisvert, Pozo & Remington 1996, NISTIR 5935): the lower
 * triangle, indices from 1, every value with the digits that give the same double back. `comments` are lines of text.
 * @throws NumericalError INPUT_LENGTH_MISMATCH for a matrix that is not square
 */
export const writeMatrixMarket = (a: SparseMatrix, comments: string[] = []): Uint8Array => {
  if (a.rows !== a.columns)
    throw new NumericalError('INPUT_LENGTH_MISMATCH', `A symmetric matrix is square; this one has ${a.rows} rows and ${a.columns} columns.`);
  let entries = 0;
  for (let column = 0; column < a.columns; column++) for (let k = a.colPtr[column]; k < a.colPtr[column + 1]; k++) if (a.rowIdx[k] >= column) entries++;
  const lines = function* (): Generator<string> {
    yield '%%MatrixMarket matrix coordinate real symmetric\n';
    for (const comment of comments) yield `% ${comment}\n`;
    yield `${a.rows} ${a.columns} ${entries}\n`;
    for (let column = 0; column < a.columns; column++)
      for (let k = a.colPtr[column]; k < a.colPtr[column + 1]; k++) if (a.rowIdx[k] >= column) yield `${a.rowIdx[k] + 1} ${column + 1} ${a.values[k]}\n`;
  };
  return joined([...encodeLines(lines())]);
};

/** A diagonal matrix in the same format. */
export const writeDiagonalMarket = (diagonal: Float64Array, comments: string[] = []): Uint8Array => {
  const n = diagonal.length;
  return writeMatrixMarket(
    { rows: n, columns: n, colPtr: Uint32Array.from({ length: n + 1 }, (_, i) => i), rowIdx: Uint32Array.from({ length: n }, (_, i) => i), values: diagonal },
    comments,
  );
};
