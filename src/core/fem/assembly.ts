/**
 * Assembly of the P1 mass and stiffness matrices over a triangulation in the plane or on the sphere (flat facets):
 * M_ij = integral of phi_i phi_j, K_ij = integral of grad phi_i . grad phi_j, natural boundary.
 */
import { NumericalError } from '#core/errors.ts';
import type { Mesh } from '#core/geometry/mesh.ts';
import { nodePositions } from '#core/geometry/positions.ts';
import type { SparseMatrix } from '#core/sparse/matrix.ts';
import { p1Stiffness } from './p1-element.ts';

/** Mass and stiffness share one symmetric pattern: the same `colPtr` and `rowIdx` arrays. km² and no unit. */
export interface MeshMatrices {
  mass: SparseMatrix;
  /** Row sums of `mass`, km². */
  lumpedMass: Float64Array;
  stiffness: SparseMatrix;
}

/** Assembles a mesh. Throws MESH_INVALID naming the first element of zero area, INDEX_OUT_OF_RANGE for a bad index. */
export function assembleMatrices(mesh: Mesh): MeshMatrices {
  return assembleFromPositions(nodePositions(mesh), mesh.triangles);
}

/** As `assembleMatrices`, from 3 coordinates per node in km. */
export function assembleFromPositions(positions: Float64Array, triangles: Uint32Array): MeshMatrices {
  const n = positions.length / 3;
  checkIndices(triangles, n);
  const { colPtr, rowIdx } = nodePattern(triangles, n);
  const mass = new Float64Array(rowIdx.length);
  const stiffness = new Float64Array(rowIdx.length);
  const lumpedMass = new Float64Array(n);
  const element = new Float64Array(4);
  const diagonal = new Uint32Array(n);
  for (let j = 0; j < n; j++) diagonal[j] = find(colPtr, rowIdx, j, j);
  for (let t = 0; t < triangles.length; t += 3) {
    for (let k = 0; k < 3; k++) {
      // the three edges in turn: each pass writes one off-diagonal pair
      const i = triangles[t + k];
      const j = triangles[t + ((k + 1) % 3)];
      if (k === 0) {
        const a = 3 * i, b = 3 * j, c = 3 * triangles[t + 2];
        p1Stiffness(
          positions[a], positions[a + 1], positions[a + 2],
          positions[b], positions[b + 1], positions[b + 2],
          positions[c], positions[c + 1], positions[c + 2],
          element,
        );
        if (!(element[3] > 0) || !Number.isFinite(element[0] + element[1] + element[2] + element[3])) throwFlatElement(t / 3, triangles);
      }
      const kij = element[k];
      const mij = element[3] / 12;
      const upper = find(colPtr, rowIdx, i, j);
      const lower = find(colPtr, rowIdx, j, i);
      stiffness[upper] += kij;
      stiffness[lower] += kij;
      mass[upper] += mij;
      mass[lower] += mij;
      stiffness[diagonal[i]] -= kij;
      stiffness[diagonal[j]] -= kij;
      mass[diagonal[i]] += 2 * mij;
      lumpedMass[i] += 4 * mij;
    }
  }
  const shape = { rows: n, columns: n, colPtr, rowIdx };
  return { mass: { ...shape, values: mass }, lumpedMass, stiffness: { ...shape, values: stiffness } };
}

/** Symmetric pattern of the nodes that share an element, the diagonal included. */
function nodePattern(triangles: Uint32Array, n: number): { colPtr: Uint32Array; rowIdx: Uint32Array } {
  const start = new Uint32Array(n + 1);
  for (const node of triangles) start[node + 1] += 2;
  for (let i = 0; i < n; i++) start[i + 1] += start[i];
  const next = start.slice(0, n);
  const neighbours = new Uint32Array(2 * triangles.length);
  for (let t = 0; t < triangles.length; t += 3)
    for (let k = 0; k < 3; k++) {
      const i = triangles[t + k];
      neighbours[next[i]++] = triangles[t + ((k + 1) % 3)];
      neighbours[next[i]++] = triangles[t + ((k + 2) % 3)];
    }
  const colPtr = new Uint32Array(n + 1);
  const rowIdx = new Uint32Array(neighbours.length + n);
  let count = 0;
  for (let j = 0; j < n; j++) {
    const first = count;
    insertAscending(rowIdx, first, count++, j);
    for (let p = start[j]; p < start[j + 1]; p++) if (insertAscending(rowIdx, first, count, neighbours[p])) count++;
    colPtr[j + 1] = count;
  }
  return { colPtr, rowIdx: rowIdx.slice(0, count) };
}

function insertAscending(list: Uint32Array, first: number, end: number, value: number): boolean {
  let p = end;
  while (p > first && list[p - 1] > value) p--;
  if (p > first && list[p - 1] === value) return false;
  list.copyWithin(p + 1, p, end);
  list[p] = value;
  return true;
}

function find(colPtr: Uint32Array, rowIdx: Uint32Array, row: number, column: number): number {
  let p = colPtr[column];
  while (rowIdx[p] !== row) p++;
  return p;
}

function checkIndices(triangles: Uint32Array, n: number): void {
  for (let k = 0; k < triangles.length; k++)
    if (triangles[k] >= n)
      throw new NumericalError('INDEX_OUT_OF_RANGE', `Element ${Math.floor(k / 3)} refers to node ${triangles[k]}, but the mesh has ${n} nodes (counted from 0).`, { details: { element: Math.floor(k / 3), node: triangles[k] } });
}

function throwFlatElement(element: number, triangles: Uint32Array): never {
  const nodes = Array.from(triangles.slice(3 * element, 3 * element + 3));
  throw new NumericalError('MESH_INVALID', `Element ${element} (nodes ${nodes.join(', ')}) has no area, so its matrices do not exist. Remove it or move one of its nodes.`, { details: { element, nodes } });
}
