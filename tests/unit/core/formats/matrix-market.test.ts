import fc from 'fast-check';
import { describe, expect, it } from 'vitest';

import { writeDiagonalMarket, writeMatrixMarket } from '#core/formats/matrix-market.ts';
import type { SparseMatrix } from '#core/sparse/matrix.ts';

import { failure } from './sample-file.ts';

/** A reader of its own, by the format's description: NISTIR 5935, "coordinate formats for sparse matrices". */
const read = (bytes: Uint8Array): { banner: string; comments: string[]; rows: number; columns: number; entries: [number, number, number][] } => {
  const lines = new TextDecoder('utf-8', { fatal: true }).decode(bytes).split('\n');
  expect(lines.pop()).toBe('');
  const banner = lines.shift()!;
  const comments = lines.filter((line) => line.startsWith('%'));
  const [size, ...data] = lines.filter((line) => !line.startsWith('%'));
  const [rows, columns, count] = size.split(' ').map(Number);
  expect(data).toHaveLength(count);
  return { banner, comments, rows, columns, entries: data.map((line) => line.split(' ').map(Number) as [number, number, number]) };
};

const dense = (values: number[][]): SparseMatrix => {
  const n = values.length;
  return {
    rows: n,
    columns: n,
    colPtr: Uint32Array.from({ length: n + 1 }, (_, j) => n * j),
    rowIdx: Uint32Array.from({ length: n * n }, (_, k) => k % n),
    values: Float64Array.from({ length: n * n }, (_, k) => values[k % n][Math.floor(k / n)]),
  };
};

describe('writeMatrixMarket', () => {
  it('writes the lower triangle of a symmetric matrix with indices from 1', () => {
    const file = read(writeMatrixMarket(dense([[2, -1, 0.1], [-1, 3, 7], [0.1, 7, 4]]), ['one', 'two']));
    expect(file.banner).toBe('%%MatrixMarket matrix coordinate real symmetric');
    expect(file.comments).toEqual(['% one', '% two']);
    expect([file.rows, file.columns]).toEqual([3, 3]);
    expect(file.entries).toEqual([[1, 1, 2], [2, 1, -1], [3, 1, 0.1], [2, 2, 3], [3, 2, 7], [3, 3, 4]]);
  });

  it('gives every double back exactly', () => {
    fc.assert(
      fc.property(fc.array(fc.double({ noNaN: true, noDefaultInfinity: true }), { minLength: 1, maxLength: 50 }), (values) => {
        const { entries } = read(writeDiagonalMarket(Float64Array.from(values)));
        // text has no negative zero to tell apart in a sum
        expect(entries.map(([, , value]) => value + 0)).toEqual(values.map((value) => value + 0));
        expect(entries.map(([i, j]) => [i, j])).toEqual(values.map((_, k) => [k + 1, k + 1]));
      }),
    );
  });

  it('writes more lines than it encodes at once, each once', () => {
    const n = 45_001;
    const { entries } = read(writeDiagonalMarket(Float64Array.from({ length: n }, (_, i) => i / 3)));
    expect(entries).toHaveLength(n);
    expect(entries.every(([i, j, value], k) => i === k + 1 && j === k + 1 && value === k / 3)).toBe(true);
  });

  it('refuses a matrix that is not square', async () => {
    const wide: SparseMatrix = { rows: 1, columns: 2, colPtr: Uint32Array.of(0, 1, 2), rowIdx: Uint32Array.of(0, 0), values: Float64Array.of(1, 1) };
    expect((await failure(() => writeMatrixMarket(wide))).message).toContain('1 rows and 2 columns');
  });
});
