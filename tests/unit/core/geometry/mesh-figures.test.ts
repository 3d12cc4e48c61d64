import { describe, expect, it } from 'vitest';

import type { Mesh } from '#core/geometry/mesh.ts';
import { meshBytes } from '#core/geometry/mesh-bytes.ts';
import { nodePositions } from '#core/geometry/positions.ts';
import { elementQuality } from '#core/geometry/quality.ts';

const plane = (nodes: [number, number][], triangles: number[]): Mesh => ({ crs: 'plane-km', radiusKm: 0, coordinates: Float64Array.from(nodes.flat()), triangles: Uint32Array.from(triangles) });

describe('element quality', () => {
  it('of the equilateral triangle, the half square and the 3-4-5 triangle is what geometry says', () => {
    const mesh = plane([[0, 0], [2, 0], [1, Math.sqrt(3)], [10, 0], [11, 0], [10, 1], [20, 0], [24, 0], [20, 3]], [0, 1, 2, 3, 4, 5, 6, 7, 8]);
    const q = elementQuality(mesh);
    const close = (values: Float64Array, expected: number[]): void => expected.forEach((v, k) => expect(values[k]).toBeCloseTo(v, 12));
    close(q.areaKm2, [Math.sqrt(3), 0.5, 6]);
    close(q.smallestAngle, [60, 45, (Math.atan(3 / 4) * 180) / Math.PI]);
    close(q.largestAngle, [60, 90, 90]);
    // 4 sqrt(3) area over the sum of squared edges (Shewchuk 2002)
    close(q.meanRatio, [1, (4 * Math.sqrt(3) * 0.5) / 4, (4 * Math.sqrt(3) * 6) / 50]);
    close(q.longestEdgeKm, [2, Math.SQRT2, 5]);
    close(q.shortestEdgeKm, [2, 1, 3]);
  });

  it('tells clockwise by a negative area', () => {
    expect(elementQuality(plane([[0, 0], [1, 0], [0, 1]], [0, 2, 1])).areaKm2[0]).toBe(-0.5);
  });

  it('keeps the digits of a needle\'s angle', () => {
    // the angle at the far end of a needle of width w and length 1 is atan(w)
    for (const width of [1e-3, 1e-6, 1e-9]) {
      const { smallestAngle } = elementQuality(plane([[0, 0], [1, 0], [1, width]], [0, 1, 2]));
      expect(smallestAngle[0] / ((Math.atan(width) * 180) / Math.PI)).toBeCloseTo(1, 12);
    }
  });

  it('on the sphere is of the flat triangle through the nodes: an octant is equilateral with edges of sqrt(2) radii', () => {
    const q = elementQuality({ crs: 'lonlat-deg', radiusKm: 100, coordinates: Float64Array.of(0, 0, 90, 0, 0, 90), triangles: Uint32Array.of(0, 1, 2, 0, 2, 1) });
    expect(q.longestEdgeKm[0]).toBeCloseTo(100 * Math.SQRT2, 10);
    expect(q.smallestAngle[0]).toBeCloseTo(60, 10);
    expect(q.areaKm2[0]).toBeCloseTo((Math.sqrt(3) / 4) * 20_000, 8);
    expect(q.areaKm2[1]).toBeCloseTo(-(Math.sqrt(3) / 4) * 20_000, 8);
  });
});

describe('node positions', () => {
  it('lie on the sphere of the mesh, or in the plane', () => {
    const sphere = nodePositions({ crs: 'lonlat-deg', radiusKm: 6371, coordinates: Float64Array.of(0, 0, 90, 0, -180, 0, 12, 90) });
    [6371, 0, 0, 0, 6371, 0, -6371, 0, 0, 0, 0, 6371].forEach((v, k) => expect(sphere[k]).toBeCloseTo(v, 9));
    expect([...nodePositions({ crs: 'plane-km', radiusKm: 0, coordinates: Float64Array.of(3, 4) })]).toEqual([3, 4, 0]);
  });
});

describe('mesh bytes', () => {
  const mesh: Mesh = { crs: 'lonlat-deg', radiusKm: 6371, coordinates: Float64Array.of(1, 2, 3, 4, 5, 6), triangles: Uint32Array.of(0, 1, 2) };

  it('are laid out as documented, little-endian', () => {
    const bytes = meshBytes(mesh);
    const view = new DataView(bytes.buffer);
    expect(new TextDecoder().decode(bytes.subarray(0, 8))).toBe('SLVMESH1');
    expect([8, 12, 16, 20].map((at) => view.getUint32(at, true))).toEqual([0, 3, 1, 0]);
    expect(view.getFloat64(24, true)).toBe(6371);
    expect([0, 1, 2, 3, 4, 5].map((k) => view.getFloat64(32 + 8 * k, true))).toEqual([1, 2, 3, 4, 5, 6]);
    expect([0, 1, 2].map((k) => view.getUint32(80 + 4 * k, true))).toEqual([0, 1, 2]);
    expect(bytes).toHaveLength(92);
  });

  it('differ when a coordinate, the order of a triangle, the radius or the coordinate reference does', () => {
    const text = (m: Mesh): string => meshBytes(m).join();
    const others: Mesh[] = [
      { ...mesh, coordinates: Float64Array.of(1, 2, 3, 4, 5, 6 + 2 ** -50) },
      { ...mesh, triangles: Uint32Array.of(1, 2, 0) },
      { ...mesh, radiusKm: 6372 },
      { ...mesh, crs: 'plane-km' },
    ];
    expect(new Set([mesh, ...others].map(text)).size).toBe(5);
  });

  it('do not depend on the radius in the plane, where it means nothing', () => {
    expect(meshBytes({ ...mesh, crs: 'plane-km', radiusKm: 1 })).toEqual(meshBytes({ ...mesh, crs: 'plane-km', radiusKm: 2 }));
  });
});
