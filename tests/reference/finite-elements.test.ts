import { EigenvalueDecomposition, CholeskyDecomposition, Matrix, solve } from 'ml-matrix';
import { describe, expect, it } from 'vitest';

import { assembleFromPositions, assembleMatrices } from '#core/fem/assembly.ts';
import type { SparseMatrix } from '#core/sparse/matrix.ts';
import { entryAt } from '#core/sparse/matrix.ts';
import { referenceValues } from './reference-values.ts';

const dense = (a: SparseMatrix) => Matrix.zeros(a.rows, a.columns).apply(function (this: Matrix, i: number, j: number) {
  this.set(i, j, entryAt(a, i, j));
});

/** Largest difference of two matrices relative to the second one's largest entry. */
const difference = (a: SparseMatrix, b: number[][]) => {
  const scale = Math.max(...b.flat().map(Math.abs));
  return Math.max(...b.flatMap((row, i) => row.map((value, j) => Math.abs(entryAt(a, i, j) - value)))) / scale;
};

describe('element matrices', () => {
  const values = referenceValues('element-matrices');

  const triangles: { name: string; t: any }[] = values.triangles.map((t: any) => ({ name: t.name, t }));

  it.each(triangles)('agree with the closed form: $name', ({ t }) => {
    const vertices: number[][] = t.vertices_xyz ?? t.vertices.map((p: number[]) => [...p, 0]);
    const { mass, lumpedMass, stiffness } = assembleFromPositions(Float64Array.from(vertices.flat()), Uint32Array.of(0, 1, 2));
    expect(difference(mass, t.mass)).toBeLessThan(values.tolerance);
    expect(difference(stiffness, t.stiffness)).toBeLessThan(values.tolerance);
    lumpedMass.forEach((value, i) => expect(Math.abs(value / t.lumped[i] - 1)).toBeLessThan(values.tolerance));
  });

  it('agree on the sphere from longitude and latitude', () => {
    for (const t of values.triangles.filter((each: any) => each.lonlat_deg)) {
      const { stiffness } = assembleMatrices({ crs: 'lonlat-deg', radiusKm: t.radius, coordinates: Float64Array.from(t.lonlat_deg.flat()), triangles: Uint32Array.of(0, 1, 2) });
      expect(difference(stiffness, t.stiffness)).toBeLessThan(values.tolerance);
    }
  });
});

describe('assembled matrices', () => {
  // exact rational arithmetic, small_mesh_exact
  it('agree with exact arithmetic on five nodes', () => {
    const s = referenceValues('small-mesh-exact');
    const { mass, stiffness, lumpedMass } = assembleFromPositions(Float64Array.from(s.points.flatMap((p: number[]) => [...p, 0])), Uint32Array.from(s.triangles.flat()));
    expect(difference(mass, s.M)).toBeLessThan(s.tolerance);
    expect(difference(stiffness, s.K)).toBeLessThan(s.tolerance);
    lumpedMass.forEach((value, i) => expect(value).toBeCloseTo(s.lumped[i], 14));
  });

  it('name an element without area', () => {
    expect(() => assembleFromPositions(Float64Array.of(0, 0, 0, 1, 0, 0, 2, 0, 0), Uint32Array.of(0, 1, 2))).toThrowError(/Element 0 .* no area/);
  });

  it('name an element that refers to a missing node', () => {
    expect(() => assembleFromPositions(Float64Array.of(0, 0, 0, 1, 0, 0, 0, 1, 0), Uint32Array.of(0, 1, 3))).toThrowError(/refers to node 3/);
  });
});

/** Smallest eigenvalues of K v = lambda M v by reduction with M's Cholesky factor. */
function eigenvalues(positions: number[], triangles: number[], count: number): number[] {
  const { mass, stiffness } = assembleFromPositions(Float64Array.from(positions), Uint32Array.from(triangles));
  const factor = new CholeskyDecomposition(dense(mass)).lowerTriangularMatrix;
  const half = solve(factor, dense(stiffness));
  const reduced = solve(factor, half.transpose());
  const symmetric = Matrix.add(reduced, reduced.transpose()).mul(0.5);
  return new EigenvalueDecomposition(symmetric, { assumeSymmetric: true }).realEigenvalues.sort((a, b) => a - b).slice(0, count);
}

function squareMesh(n: number) {
  const positions: number[] = [];
  const triangles: number[] = [];
  for (let j = 0; j <= n; j++) for (let i = 0; i <= n; i++) positions.push(i / n, j / n, 0);
  for (let j = 0; j < n; j++)
    for (let i = 0; i < n; i++) {
      const a = j * (n + 1) + i;
      if ((i + j) % 2 === 0) triangles.push(a, a + 1, a + n + 2, a, a + n + 2, a + n + 1);
      else triangles.push(a, a + 1, a + n + 1, a + 1, a + n + 2, a + n + 1);
    }
  return { positions, triangles };
}

/** Unit disc of concentric rings, 6k nodes on ring k. */
function discMesh(rings: number) {
  const positions = [0, 0, 0];
  const triangles: number[] = [];
  const first = (k: number) => (k === 0 ? 0 : 1 + 3 * k * (k - 1));
  for (let k = 1; k <= rings; k++)
    for (let j = 0; j < 6 * k; j++) positions.push((k / rings) * Math.cos((Math.PI * j) / (3 * k)), (k / rings) * Math.sin((Math.PI * j) / (3 * k)), 0);
  for (let k = 1; k <= rings; k++)
    for (let sector = 0; sector < 6; sector++)
      for (let i = 0; i < k; i++) {
        const out = (j: number) => first(k) + ((sector * k + j) % (6 * k));
        const inn = (j: number) => (k === 1 ? 0 : first(k - 1) + ((sector * (k - 1) + j) % (6 * (k - 1))));
        triangles.push(inn(i), out(i), out(i + 1));
        if (i < k - 1) triangles.push(inn(i), out(i + 1), inn(i + 1));
      }
  return { positions, triangles };
}

describe('Neumann eigenvalues', () => {
  const values = referenceValues('neumann-eigenvalues');
  const observedOrder = (coarse: number, fine: number, ratio: number) => Math.log(coarse / fine) / Math.log(ratio);

  it('of the unit square converge from above with order 2', () => {
    const exact = values.unit_square.map((c: any) => c.lambda).slice(1, 6);
    const errors = [6, 12].map((n) => {
      const mesh = squareMesh(n);
      return eigenvalues(mesh.positions, mesh.triangles, 6).slice(1).map((value, k) => value / exact[k] - 1);
    });
    errors[1].forEach((error, k) => {
      expect(error).toBeGreaterThan(0);
      expect(Math.abs(observedOrder(errors[0][k], error, 2) - 2)).toBeLessThan(0.2);
    });
  });

  it('of the unit disc converge from above with order 2', () => {
    const exact = values.unit_disk.flatMap((c: any) => new Array(c.multiplicity).fill(c.lambda)).slice(0, 5);
    const errors = [5, 10].map((rings) => {
      const mesh = discMesh(rings);
      return eigenvalues(mesh.positions, mesh.triangles, 6).slice(1).map((value, k) => value / exact[k] - 1);
    });
    errors[1].forEach((error, k) => {
      expect(error).toBeGreaterThan(0);
      expect(Math.abs(observedOrder(errors[0][k], error, 2) - 2)).toBeLessThan(0.2);
    });
  });
});
