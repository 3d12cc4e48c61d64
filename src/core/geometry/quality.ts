import { atan2, degrees } from './deterministic-math.ts';
import type { Mesh } from './mesh.ts';
import { elementCount } from './mesh.ts';
import { nodePositions } from './positions.ts';

/** Per-element figures of the flat triangles (on the sphere: through their three vertices). */
export interface ElementQuality {
  /** Signed by orientation: positive where counter-clockwise (seen from outside), km². */
  areaKm2: Float64Array;
  /** Smallest angle, degrees. */
  smallestAngle: Float64Array;
  /** Largest angle, degrees. */
  largestAngle: Float64Array;
  /** 4 sqrt(3) area / sum of squared edges: 1 equilateral, 0 degenerate (Shewchuk 2002, What is a good linear finite element?). */
  meanRatio: Float64Array;
  /** Longest edge, km. */
  longestEdgeKm: Float64Array;
  shortestEdgeKm: Float64Array;
}

/** Quality of every element of a mesh; one entry per element in each array. */
export const elementQuality = (mesh: Mesh, positions: Float64Array = nodePositions(mesh)): ElementQuality => {
  const count = elementCount(mesh);
  const quality: ElementQuality = {
    areaKm2: new Float64Array(count),
    smallestAngle: new Float64Array(count),
    largestAngle: new Float64Array(count),
    meanRatio: new Float64Array(count),
    longestEdgeKm: new Float64Array(count),
    shortestEdgeKm: new Float64Array(count),
  };
  const p = positions;
  for (let t = 0; t < count; t++) {
    const a = 3 * mesh.triangles[3 * t];
    const b = 3 * mesh.triangles[3 * t + 1];
    const c = 3 * mesh.triangles[3 * t + 2];
    const ux = p[b] - p[a], uy = p[b + 1] - p[a + 1], uz = p[b + 2] - p[a + 2];
    const vx = p[c] - p[a], vy = p[c + 1] - p[a + 1], vz = p[c + 2] - p[a + 2];
    const nx = uy * vz - uz * vy, ny = uz * vx - ux * vz, nz = ux * vy - uy * vx;
    const twice = Math.sqrt(nx * nx + ny * ny + nz * nz);
    const ab = ux * ux + uy * uy + uz * uz;
    const ac = vx * vx + vy * vy + vz * vz;
    const wx = vx - ux, wy = vy - uy, wz = vz - uz;
    const bc = wx * wx + wy * wy + wz * wz;
    const outward = mesh.crs === 'lonlat-deg' ? nx * p[a] + ny * p[a + 1] + nz * p[a + 2] : nz;
    quality.areaKm2[t] = outward < 0 ? -twice / 2 : twice / 2;
    const longest = Math.max(ab, bc, ac);
    const shortest = Math.min(ab, bc, ac);
    // the angle opposite an edge, from 4 area and the squared edges: tan = 4 area / (sum of the others - itself)
    const sum = ab + bc + ac;
    quality.smallestAngle[t] = degrees(atan2(2 * twice, sum - 2 * shortest));
    quality.largestAngle[t] = degrees(atan2(2 * twice, sum - 2 * longest));
    quality.meanRatio[t] = sum > 0 ? (2 * Math.sqrt(3) * twice) / sum : 0;
    quality.longestEdgeKm[t] = Math.sqrt(longest);
    quality.shortestEdgeKm[t] = Math.sqrt(shortest);
  }
  return quality;
};
