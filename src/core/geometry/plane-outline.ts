import { NumericalError } from '#core/errors.ts';

import { atan2, cos, PI, sin } from './deterministic-math.ts';
import { planeDistance } from './distance.ts';
import type { BoundaryVertices, Stretch } from './offset-curve.ts';
import { layVertices } from './offset-curve.ts';
import { createSectorIndex } from './sector-index.ts';

/** A convex outline pushed out by a buffer, as the refinement needs it. Plane coordinates are the triangulation's. */
export interface BufferedOutline extends BoundaryVertices {
  /** Turning of each outline corner, radians. */
  turning: Float64Array;
  /** Per corner, whether the boundary is an arc about it. */
  isRounded: boolean[];
}

/** Distance on the ground from a plane position to the outline, km; 0 inside it. */
export type DistanceOutside = (x: number, y: number) => number;

/**
 * Longest step along an arc, radians. Chords then stay within 0.5 % of the radius, and within 0.8 % where they stand
 * for a part of a straight stretch of half a radius too. A corner that turns less is never squared off: its
 * tangents' meeting point is within 0.5 % of the buffer.
 */
export const ARC_STEP = 0.2;

/** Whether a corner that turns by `angle` gets an arc. */
export const isRoundedCorner = (corners: 'round' | 'square', angle: number): boolean => corners === 'round' || angle <= ARC_STEP;

/**
 * The outer boundary of a convex ring (2 per corner, counter-clockwise, km) at a distance, corners rounded about the
 * outline's corners or squared off by tangents, a corner of more than 90 degrees by several, so that no squared
 * corner is farther than sqrt(2) buffers. Vertices are at most `edgeKm` apart.
 */
export const bufferPlane = (ring: Float64Array, bufferKm: number, edgeKm: number, corners: 'round' | 'square'): BufferedOutline => {
  const count = ring.length / 2;
  const turning = new Float64Array(count);
  const stretches: Stretch[] = [];
  const normals = Array.from({ length: count }, (_, i): [number, number] => {
    const j = (i + 1) % count;
    const dx = ring[2 * j] - ring[2 * i], dy = ring[2 * j + 1] - ring[2 * i + 1];
    const length = Math.sqrt(dx * dx + dy * dy);
    return [dy / length, -dx / length];
  });
  const straight = (ax: number, ay: number, bx: number, by: number, isCorner: boolean): void => {
    stretches.push({
      length: planeDistance(ax, ay, bx, by),
      step: edgeKm,
      bend: 0,
      isCorner,
      push: (share, out) => void out.push(ax + (bx - ax) * share, ay + (by - ay) * share),
    });
  };
  for (let i = 0; i < count; i++) {
    const j = (i + 1) % count;
    const [nx, ny] = normals[i];
    const [mx, my] = normals[j];
    const angle = atan2(nx * my - ny * mx, nx * mx + ny * my);
    turning[j] = angle;
    const vx = ring[2 * j], vy = ring[2 * j + 1];
    straight(ring[2 * i] + bufferKm * nx, ring[2 * i + 1] + bufferKm * ny, vx + bufferKm * nx, vy + bufferKm * ny, false);
    const at = (phi: number, r: number): [number, number] => {
      const c = cos(phi), s = sin(phi);
      return [vx + r * (c * nx - s * ny), vy + r * (s * nx + c * ny)];
    };
    if (isRoundedCorner(corners, angle)) {
      stretches.push({
        length: angle * bufferKm,
        step: Math.min(edgeKm, ARC_STEP * bufferKm),
        bend: 1 / bufferKm,
        isCorner: false,
        push: (share, out) => void out.push(...at(angle * share, bufferKm)),
      });
    } else {
      const parts = Math.max(1, Math.ceil(angle / (PI / 2)));
      const reach = bufferKm / cos(angle / (2 * parts));
      for (let k = 0; k < parts; k++) {
        const from = at((angle * k) / parts, bufferKm);
        const tip = at((angle * (k + 0.5)) / parts, reach);
        const to = at((angle * (k + 1)) / parts, bufferKm);
        straight(...from, ...tip, false);
        straight(...tip, ...to, true);
      }
    }
  }
  return { ...layVertices(stretches), turning, isRounded: Array.from(turning, (angle) => isRoundedCorner(corners, angle)) };
};

/** `DistanceOutside` for a convex plane ring: from the side in the position's direction, along the sides that face it. */
export const distanceOutsidePlane = (ring: Float64Array): DistanceOutside => {
  const count = ring.length / 2;
  const direction = new Float64Array(2 * count);
  const length = new Float64Array(count);
  let cx = 0, cy = 0;
  for (let i = 0; i < count; i++) {
    const j = (i + 1) % count;
    const dx = ring[2 * j] - ring[2 * i], dy = ring[2 * j + 1] - ring[2 * i + 1];
    length[i] = Math.sqrt(dx * dx + dy * dy);
    direction[2 * i] = dx / length[i];
    direction[2 * i + 1] = dy / length[i];
    cx += ring[2 * i] / count;
    cy += ring[2 * i + 1] / count;
  }
  const sideTowards = createSectorIndex(ring, cx, cy);
  return (x, y) => {
    let i = sideTowards(x, y);
    let heading = 0;
    // along the sides that face a position its distance falls and then rises: both ways down there is one way
    for (let step = 0; step < count; step++) {
      const dx = x - ring[2 * i], dy = y - ring[2 * i + 1];
      const out = dx * direction[2 * i + 1] - dy * direction[2 * i];
      if (step === 0 && out <= 0) return 0;
      const along = dx * direction[2 * i] + dy * direction[2 * i + 1];
      if (along >= 0 && along <= length[i]) return out > 0 ? out : 0;
      const next = along < 0 ? -1 : 1;
      if (heading + next === 0) {
        // before this side and beyond the last: their common corner
        const k = next < 0 ? i : (i + 1) % count;
        return planeDistance(x, y, ring[2 * k], ring[2 * k + 1]);
      }
      heading = next;
      i = (i + next + count) % count;
    }
    throw new NumericalError('NOT_CONVERGED', 'The side of the outline nearest to a position was not found. Report this observation set as a fault.');
  };
};
