import Delaunator from 'delaunator';
import { describe, expect, it } from 'vitest';

import { NODE_KIND } from '#core/geometry/mesh.ts';
import { createDisplayProjection, frameOf } from '#client/map/display-projection.ts';
import { meshBuffers, uniqueEdges } from '#client/map/mesh-buffers.ts';
import { distanceOutside } from '#client/map/boundary-drag.ts';
import { createPicker } from '#client/map/pick.ts';

const grid = (n: number): Float64Array => Float64Array.from({ length: 2 * n * n }, (_, k) => (k % 2 === 0 ? (k >> 1) % n : Math.floor((k >> 1) / n)) + 0.001 * Math.sin(k));

describe('mesh buffers', () => {
  const { triangles, hull } = new Delaunator(grid(9));

  it('holds every edge once: nodes + elements - 1 of them in a simply connected mesh (Euler)', () => {
    const edges = uniqueEdges(Uint32Array.from(triangles), 81);
    expect(edges.length / 2).toBe(81 + triangles.length / 3 - 1);
    const keys = new Set(Array.from({ length: edges.length / 2 }, (_, k) => `${edges[2 * k]} ${edges[2 * k + 1]}`));
    expect(keys.size).toBe(edges.length / 2);
  });

  it('puts every element either in the core or in the buffer', () => {
    const nodeKind = new Uint8Array(81);
    for (const node of hull) nodeKind[node] = NODE_KIND.boundary;
    const projection = createDisplayProjection(frameOf('plane-km', [0, 8], [0, 8], 0));
    const mesh = { coordinates: grid(9), triangles: Uint32Array.from(triangles), nodeKind, boundaryLoops: [Uint32Array.from(hull)], outline: [Float64Array.from([1, 1, 7, 1, 7, 7, 1, 7])] };
    const buffers = meshBuffers(mesh, projection);
    expect(buffers.core.length + buffers.buffer.length).toBe(triangles.length);
    expect(buffers.core.length).toBeGreaterThan(0);
    for (const node of buffers.core) expect(nodeKind[node]).not.toBe(NODE_KIND.boundary);
    expect(buffers.boundary).toHaveLength(4 * hull.length);
    expect([...buffers.outline.slice(0, 4)]).toEqual([-3, -3, 3, -3]);
  });
});

describe('display projection', () => {
  it.each([
    ['across the antimeridian', [179, -179], [10, 12]],
    ['at the pole', [0, 120, -120], [89, 88, 87]],
    ['at mid latitudes', [5, 7], [50, 51]],
  ])('comes back to the coordinates %s', (_, lon, lat) => {
    const projection = createDisplayProjection(frameOf('lonlat-deg', lon, lat, 6371));
    lon.forEach((x, i) => {
      const [mapX, mapY] = projection.forward(x, lat[i]);
      expect(Math.hypot(mapX, mapY)).toBeLessThan(600);
      const [backX, backY] = projection.inverse(mapX, mapY);
      expect([backX, backY]).toEqual([expect.closeTo(x, 7), expect.closeTo(lat[i], 7)]);
    });
  });
});

describe('boundary drag', () => {
  const square = Float32Array.from([0, 0, 10, 0, 10, 0, 10, 10, 10, 10, 0, 10, 0, 10, 0, 0]);
  it('measures from the outline: outwards positive, inwards negative, about corners along arcs', () => {
    expect(distanceOutside(15, 5, square)).toBeCloseTo(5, 12);
    expect(distanceOutside(13, 14, square)).toBeCloseTo(5, 12);
    expect(distanceOutside(2, 5, square)).toBeCloseTo(-2, 12);
  });
});

describe('picker', () => {
  const picker = createPicker(Float32Array.from(grid(9)));
  it('finds the nearest point within reach, and none beyond it', () => {
    expect(picker.near(4.2, 4.1, 1)).toBe(4 * 9 + 4);
    expect(picker.near(30, 4, 1)).toBe(-1);
  });
  it('steps to the neighbour in a direction, and nowhere at the edge', () => {
    expect(picker.step(40, 1, 0)).toBe(41);
    expect(picker.step(40, 0, 1)).toBe(49);
    expect(picker.step(8, 1, 0)).toBe(-1);
  });
});
