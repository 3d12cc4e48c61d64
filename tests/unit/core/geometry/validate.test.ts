import { describe, expect, it } from 'vitest';

import type { Mesh } from '#core/geometry/mesh.ts';
import { meshTopology, nonDelaunayEdges, validateMesh } from '#core/geometry/validate.ts';

type Node = [number, number];
const mesh = (nodes: Node[], triangles: number[][], crs: Mesh['crs'] = 'plane-km'): Mesh => ({
  crs,
  radiusKm: crs === 'plane-km' ? 0 : 6371,
  coordinates: Float64Array.from(nodes.flat()),
  triangles: Uint32Array.from(triangles.flat()),
});
const square: Node[] = [[0, 0], [1, 0], [1, 1], [0, 1]];
const halves = [[0, 1, 2], [0, 2, 3]];
const kinds = (m: Mesh): string[] => validateMesh(m).map(({ kind }) => kind);

describe('a sound mesh has no problem', () => {
  it('a square', () => {
    const topology = meshTopology(mesh(square, halves));
    expect(topology).toMatchObject({ problems: [], edges: 5, boundaryEdges: 4, components: 1, eulerCharacteristic: 1 });
    expect(topology.boundaryLoops.map((loop) => [...loop])).toEqual([[0, 1, 2, 3]]);
  });

  it('a ring of elements round a hole: characteristic 0, two loops, the inner one clockwise', () => {
    const outer: Node[] = [[0, 0], [3, 0], [3, 3], [0, 3]];
    const inner: Node[] = [[1, 1], [2, 1], [2, 2], [1, 2]];
    const triangles = [0, 1, 2, 3].flatMap((k) => [[k, (k + 1) % 4, 4 + ((k + 1) % 4)], [k, 4 + ((k + 1) % 4), 4 + k]]);
    const topology = meshTopology(mesh([...outer, ...inner], triangles));
    expect(topology).toMatchObject({ problems: [], eulerCharacteristic: 0 });
    expect(topology.boundaryLoops.map((loop) => [...loop])).toEqual([[0, 1, 2, 3], [4, 7, 6, 5]]);
  });

  it('an octahedron closed round the sphere: characteristic 2, no boundary, longitudes across the antimeridian', () => {
    const nodes: Node[] = [[0, 0], [90, 0], [-180, 0], [-90, 0], [0, 90], [0, -90]];
    const triangles = [0, 1, 2, 3].flatMap((k) => [[k, (k + 1) % 4, 4], [(k + 1) % 4, k, 5]]);
    expect(meshTopology(mesh(nodes, triangles, 'lonlat-deg'))).toMatchObject({ problems: [], eulerCharacteristic: 2, boundaryEdges: 0, components: 1 });
  });

  it('two parts', () => {
    const away = square.map(([x, y]): Node => [x + 5, y]);
    expect(meshTopology(mesh([...square, ...away], [...halves, [4, 5, 6], [4, 6, 7]]))).toMatchObject({ problems: [], components: 2, eulerCharacteristic: 2 });
  });
});

describe('a broken mesh is named', () => {
  it.each<[string, string, Mesh]>([
    ['a coordinate that is no number', 'not-finite', mesh([[0, 0], [1, 0], [1, NaN], [0, 1]], halves)],
    ['a latitude of 95', 'out-of-range', mesh([[0, 0], [1, 0], [1, 95], [0, 1]], halves, 'lonlat-deg')],
    ['a node that does not exist', 'out-of-range', mesh(square, [[0, 1, 2], [0, 2, 4]])],
    ['an element that names a node twice', 'repeated-node', mesh(square, [[0, 1, 2], [0, 2, 2]])],
    ['a clockwise element', 'orientation', mesh(square, [[0, 1, 2], [0, 3, 2]])],
    ['a flat element', 'orientation', mesh([[0, 0], [1, 0], [2, 0]], [[0, 1, 2]])],
    ['an element turned over on the sphere', 'orientation', mesh([[179, 0], [-179, 0], [180, 2]], [[0, 2, 1]], 'lonlat-deg')],
    ['three elements on an edge', 'edge-shared', mesh([...square, [2, -1]], [...halves, [0, 1, 3]])],
    ['a node in no element', 'orphan', mesh([...square, [9, 9]], halves)],
    ['two nodes in one place', 'duplicate', mesh([...square, [1, 1], [2, 1], [2, 2]], [...halves, [4, 5, 6]])],
    ['the same place by two longitudes', 'duplicate', mesh([[-180, 0], [-178, 0], [-178, 2], [180, 0], [-178, -2]], [[0, 1, 2], [3, 4, 1]], 'lonlat-deg')],
    ['two elements that touch at a node only', 'pinched', mesh([...square, [2, 1], [2, 2]], [...halves, [2, 4, 5]])],
  ])('%s: %s', (_name, kind, broken) => {
    expect(kinds(broken)).toContain(kind);
    for (const problem of validateMesh(broken)) expect(problem.message).toMatch(/\.$/);
  });

  it('a handle: a torus has characteristic 0 and no boundary', () => {
    // 3 x 3 nodes with both directions closed; coordinates only have to be apart
    const nodes = Array.from({ length: 9 }, (_, k): Node => [k % 3, Math.floor(k / 3) + 0.1 * (k % 3)]);
    const at = (i: number, j: number): number => (i % 3) + 3 * (j % 3);
    const triangles = nodes.flatMap((_, k) => {
      const [i, j] = [k % 3, Math.floor(k / 3)];
      return [[at(i, j), at(i + 1, j), at(i + 1, j + 1)], [at(i, j), at(i + 1, j + 1), at(i, j + 1)]];
    });
    expect(kinds(mesh(nodes, triangles))).toContain('euler');
  });

  it('with the elements and nodes concerned', () => {
    expect(validateMesh(mesh([...square, [9, 9]], halves))[0]).toMatchObject({ nodes: [4], count: 1 });
    expect(validateMesh(mesh(square, [[0, 1, 2], [0, 3, 2]]))[0]).toMatchObject({ elements: [1], count: 1 });
  });
});

describe('the Delaunay test', () => {
  const kite: Node[] = [[0, 0], [1, -0.1], [2, 0], [1, 0.1]];

  it('finds the edge that has to be flipped, and accepts the flipped one', () => {
    expect(nonDelaunayEdges(Uint32Array.of(0, 1, 2, 0, 2, 3), Float64Array.from(kite.flat())).map((edge) => edge.sort())).toEqual([[0, 2]]);
    expect(nonDelaunayEdges(Uint32Array.of(0, 1, 3, 1, 2, 3), Float64Array.from(kite.flat()))).toEqual([]);
  });

  it('accepts either diagonal of four points on a circle, and only one when a point moves by one unit in the last place', () => {
    const points = Float64Array.from(square.flat());
    expect(nonDelaunayEdges(Uint32Array.of(0, 1, 2, 0, 2, 3), points)).toEqual([]);
    expect(nonDelaunayEdges(Uint32Array.of(0, 1, 3, 1, 2, 3), points)).toEqual([]);
    points[4] = 1 - 2 ** -53;
    expect(nonDelaunayEdges(Uint32Array.of(0, 1, 3, 1, 2, 3), points).map((edge) => edge.sort())).toEqual([[1, 3]]);
    expect(nonDelaunayEdges(Uint32Array.of(0, 1, 2, 0, 2, 3), points)).toEqual([]);
  });
});
