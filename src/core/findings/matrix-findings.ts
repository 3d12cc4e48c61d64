import type { MeshMatrices } from '#core/fem/assembly.ts';
import { accurateSum } from '#core/sparse/accurate-sum.ts';
import { diagonalOf, entryAt } from '#core/sparse/matrix.ts';
import type { SparseMatrix } from '#core/sparse/matrix.ts';
import type { Measured } from './judge.ts';
import { placesOf } from './judge.ts';

/** Sum, trace, Frobenius norm and stored entries of a matrix. */
export interface MatrixFigures {
  sum: number;
  trace: number;
  frobenius: number;
  nonZeros: number;
}

export function matrixFigures(a: SparseMatrix): MatrixFigures {
  return {
    sum: accurateSum(a.values),
    trace: accurateSum(diagonalOf(a)),
    frobenius: frobeniusNorm(a.values),
    nonZeros: a.values.length,
  };
}

/** The figures of a diagonal matrix. */
export function diagonalFigures(d: Float64Array): MatrixFigures {
  const sum = accurateSum(d);
  return { sum, trace: sum, frobenius: frobeniusNorm(d), nonZeros: d.length };
}

const frobeniusNorm = (values: Float64Array): number => Math.sqrt(accurateSum(values.map((value) => value * value)));

/** Absolute row sums of a matrix. */
export function absoluteRowSums(a: SparseMatrix): Float64Array {
  const sums = new Float64Array(a.rows);
  for (let p = 0; p < a.values.length; p++) sums[a.rowIdx[p]] += a.values[p];
  return sums.map(Math.abs);
}

/** What must hold exactly, but for rounding, of M and K; `areaKm2` is the area of the elements computed apart. */
export function matrixFindings(matrices: MeshMatrices | null, areaKm2: number, skipped: number): Measured[] {
  const base = { group: 'matrices', unit: '', source: 'Strang & Fix 1973, section 1.9; Zienkiewicz, Taylor & Zhu 2013, chapter 3' } as const;
  if (!matrices) {
    const why = 'Not judged: there is no element with an area, so there are no matrices.';
    const blank = (id: Measured['id'], title: string): Measured => ({ ...base, id, title, value: null, place: {}, placeCount: 0, explanation: why });
    return [blank('mass-symmetry', 'Asymmetry of M'), blank('stiffness-symmetry', 'Asymmetry of K'), blank('stiffness-row-sums', 'Row sums of K'), blank('mass-total', 'Total of M against the area'), blank('positive-diagonals', 'Diagonal entries that are not positive')];
  }
  const { mass, stiffness } = matrices;
  const remark = skipped > 0 ? ` ${skipped} elements without area were left out of the matrices.` : '';
  const massDiagonal = diagonalOf(mass);
  const stiffnessDiagonal = diagonalOf(stiffness);
  const weak: number[] = [];
  massDiagonal.forEach((value, i) => {
    if (!(value > 0 && stiffnessDiagonal[i] > 0)) weak.push(i);
  });
  const rowSums = absoluteRowSums(stiffness);
  let worstRow = 0;
  let relative = 0;
  rowSums.forEach((sum, i) => {
    const share = stiffnessDiagonal[i] > 0 ? sum / stiffnessDiagonal[i] : 0;
    if (share <= relative) return;
    relative = share;
    worstRow = i;
  });
  const total = accurateSum(mass.values);
  return [
    {
      ...base, id: 'mass-symmetry', title: 'Asymmetry of M', value: asymmetry(mass), place: {}, placeCount: 0,
      explanation: `A covariance is symmetric only if both matrices are; the figure is the largest |M_ij - M_ji| relative to the largest entry. It is a check of the assembly, not of the mesh's accuracy.${remark}`,
    },
    {
      ...base, id: 'stiffness-symmetry', title: 'Asymmetry of K', value: asymmetry(stiffness), place: {}, placeCount: 0,
      explanation: 'As for M: the largest |K_ij - K_ji| relative to the largest entry. It is a check of the assembly, not of the mesh\'s accuracy.',
    },
    {
      ...base, id: 'stiffness-row-sums', title: 'Row sums of K', value: relative, ...placesOf('nodes', relative > 0 ? [worstRow] : []),
      explanation: 'A constant field has no gradient, so every row of K sums to zero; the figure is the largest sum relative to its diagonal. Sums beyond rounding would make the operator leak variance.',
    },
    {
      ...base, id: 'mass-total', title: 'Total of M against the area', value: areaKm2 > 0 ? Math.abs(total / areaKm2 - 1) : null, place: {}, placeCount: 0,
      explanation: 'The entries of M add up to the area of the flat elements; the figure is the relative difference. A difference means elements missing or counted twice in the assembly.',
    },
    {
      ...base, id: 'positive-diagonals', title: 'Diagonal entries that are not positive', value: weak.length, ...placesOf('nodes', weak),
      explanation: `M + l²K can be positive definite only if every diagonal entry is positive. ${weak.length === 0 ? 'All are.' : `${weak.length} nodes have an entry that is zero or negative.`}`,
    },
  ];
}

function asymmetry(a: SparseMatrix): number {
  let most = 0;
  let difference = 0;
  for (let j = 0; j < a.columns; j++)
    for (let p = a.colPtr[j]; p < a.colPtr[j + 1]; p++) {
      const i = a.rowIdx[p];
      most = Math.max(most, Math.abs(a.values[p]));
      if (i < j) difference = Math.max(difference, Math.abs(a.values[p] - entryAt(a, j, i)));
    }
  return most > 0 ? difference / most : 0;
}
