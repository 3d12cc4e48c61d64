import { atan2, cos, sin, PI } from './deterministic-math.ts';

/** A convex outline pushed out by a buffer, as the refinement needs it. Plane coordinates are the triangulation's. */
export interface BufferedOutline {
  /** 2 per vertex of the outer boundary, counter-clockwise, in plane coordinates. */
  boundary: Float64Array;
  /** Curvature in 1/km of boundary edge k, from vertex k to k + 1: 0 on straight stretches, positive on arcs. */
  curvature: Float64Array;
  /** Turning of each outline corner, radians. */
  turning: Float64Array;
}

/** Distance on the ground from a plane position to the outline, km; 0 inside it. */
export type DistanceOutside = (x: number, y: number) => number;

/** Longest step along an arc, radians: chords then stay within 0.5 % of the radius. */
export const ARC_STEP = 0.2;

/** A corner whose arc is shorter than this share of a boundary edge becomes one vertex: shorter edges would need tiny elements. */
export const SHORT_ARC = 0.4;

/**
 * The outer boundary of a convex ring (2 per corner, counter-clockwise, km) at a distance, corners rounded about the
 * outline's corners or squared off by tangents, a corner of more than 90 degrees by several, so that no squared
 * corner is farther than sqrt(2) buffers. Vertices are at most `edgeKm` apart.
 */
export const bufferPlane = (ring: Float64Array, bufferKm: number, edgeKm: number, corners: 'round' | 'square'): BufferedOutline => {
  const count = ring.length / 2;
  const points: number[] = [];
  const curvature: number[] = [];
  const turning = new Float64Array(count);
  const normal = (i: number): [number, number] => {
    const j = (i + 1) % count;
    const dx = ring[2 * j] - ring[2 * i], dy = ring[2 * j + 1] - ring[2 * i + 1];
    const length = Math.sqrt(dx * dx + dy * dy);
    return [dy / length, -dx / length];
  };
  const angleAt = (j: number): number => {
    const [nx, ny] = normal((j + count - 1) % count);
    const [mx, my] = normal(j);
    return atan2(nx * my - ny * mx, nx * mx + ny * my);
  };
  const isShort = (angle: number): boolean => angle * bufferKm < SHORT_ARC * edgeKm;
  const push = (x: number, y: number): void => {
    points.push(x, y);
    curvature.push(0);
  };
  /** All vertices of a straight stretch but its last. */
  const straight = (ax: number, ay: number, bx: number, by: number): void => {
    const length = Math.sqrt((bx - ax) ** 2 + (by - ay) ** 2);
    const steps = Math.max(1, Math.ceil(length / edgeKm));
    for (let k = 0; k < steps; k++) push(ax + ((bx - ax) * k) / steps, ay + ((by - ay) * k) / steps);
  };
  for (let i = 0; i < count; i++) {
    const j = (i + 1) % count;
    const [nx, ny] = normal(i);
    const angle = angleAt(j);
    turning[j] = angle;
    const vx = ring[2 * j], vy = ring[2 * j + 1];
    const first = points.length;
    straight(ring[2 * i] + bufferKm * nx, ring[2 * i + 1] + bufferKm * ny, vx + bufferKm * nx, vy + bufferKm * ny);
    const at = (phi: number, r: number): [number, number] => {
      const c = cos(phi), s = sin(phi);
      return [vx + r * (c * nx - s * ny), vy + r * (s * nx + c * ny)];
    };
    // the side's first vertex moves to the middle of the short arc before it
    const before = angleAt(i);
    if (isShort(before)) {
      const c = cos(before / 2), s = sin(before / 2);
      points[first] = ring[2 * i] + bufferKm * (c * nx + s * ny);
      points[first + 1] = ring[2 * i + 1] + bufferKm * (c * ny - s * nx);
    }
    if (isShort(angle)) continue;
    if (corners === 'round') {
      const steps = Math.max(1, Math.ceil(angle / ARC_STEP), Math.ceil((angle * bufferKm) / edgeKm));
      for (let k = 0; k < steps; k++) {
        points.push(...at((angle * k) / steps, bufferKm));
        curvature.push(1 / bufferKm);
      }
    } else {
      const parts = Math.max(1, Math.ceil(angle / (PI / 2)));
      const reach = bufferKm / cos(angle / (2 * parts));
      for (let k = 0; k < parts; k++) {
        const from = at((angle * k) / parts, bufferKm);
        const tip = at((angle * (k + 0.5)) / parts, reach);
        const to = at((angle * (k + 1)) / parts, bufferKm);
        straight(...from, ...tip);
        straight(...tip, ...to);
      }
    }
  }
  return { boundary: Float64Array.from(points), curvature: Float64Array.from(curvature), turning };
};

/** `DistanceOutside` for a convex plane ring. */
export const distanceOutsidePlane = (ring: Float64Array): DistanceOutside => {
  const count = ring.length / 2;
  const direction = new Float64Array(2 * count);
  const length = new Float64Array(count);
  for (let i = 0; i < count; i++) {
    const j = (i + 1) % count;
    const dx = ring[2 * j] - ring[2 * i], dy = ring[2 * j + 1] - ring[2 * i + 1];
    length[i] = Math.sqrt(dx * dx + dy * dy);
    direction[2 * i] = dx / length[i];
    direction[2 * i + 1] = dy / length[i];
  }
  return (x, y) => {
    let nearest = Infinity;
    for (let i = 0; i < count; i++) {
      const dx = x - ring[2 * i], dy = y - ring[2 * i + 1];
      const out = dx * direction[2 * i + 1] - dy * direction[2 * i];
      if (out <= 0) continue;
      const along = dx * direction[2 * i] + dy * direction[2 * i + 1];
      const beyond = along < 0 ? along : along > length[i] ? along - length[i] : 0;
      const d = out * out + beyond * beyond;
      if (d < nearest) nearest = d;
    }
    return nearest === Infinity ? 0 : Math.sqrt(nearest);
  };
};
