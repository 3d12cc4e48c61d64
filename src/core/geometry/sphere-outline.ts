import { asin, atan2, cos, sin, tan, PI } from './deterministic-math.ts';
import type { Stretch } from './offset-curve.ts';
import { layVertices } from './offset-curve.ts';
import type { BufferedOutline, DistanceOutside } from './plane-outline.ts';
import { ARC_STEP, isRoundedCorner } from './plane-outline.ts';
import { createSectorIndex } from './sector-index.ts';
import type { Stereographic } from './stereographic.ts';

type Vector = [number, number, number];

const cross = (a: Vector, b: Vector): Vector => [a[1] * b[2] - a[2] * b[1], a[2] * b[0] - a[0] * b[2], a[0] * b[1] - a[1] * b[0]];
const dot = (a: Vector, b: Vector): number => a[0] * b[0] + a[1] * b[1] + a[2] * b[2];
const unit = (a: Vector): Vector => {
  const length = Math.sqrt(dot(a, a));
  return [a[0] / length, a[1] / length, a[2] / length];
};
/** a cos + b sin: the point at an angle from a towards b, both of unit length and at right angles. */
const towards = (a: Vector, b: Vector, angle: number): Vector => {
  const c = cos(angle), s = sin(angle);
  return [c * a[0] + s * b[0], c * a[1] + s * b[1], c * a[2] + s * b[2]];
};
const angleOf = (a: Vector, b: Vector): number => {
  const n = cross(a, b);
  return atan2(Math.sqrt(dot(n, n)), dot(a, b));
};

interface Sides {
  corner: Vector[];
  /** Unit normal of side i (from corner i to i + 1) that points into the outline. */
  inward: Vector[];
  /** Unit vector at right angles to corner i along side i. */
  along: Vector[];
  /** Length of side i, radians. */
  length: number[];
}

/** Great-circle sides of a convex ring of unit vectors (3 per corner, counter-clockwise seen from outside). */
const sidesOf = (ring: Float64Array): Sides => {
  const count = ring.length / 3;
  const corner = Array.from({ length: count }, (_, i): Vector => [ring[3 * i], ring[3 * i + 1], ring[3 * i + 2]]);
  const inward = corner.map((v, i) => unit(cross(v, corner[(i + 1) % count])));
  return {
    corner,
    inward,
    along: corner.map((v, i) => cross(inward[i], v)),
    length: corner.map((v, i) => angleOf(v, corner[(i + 1) % count])),
  };
};

/**
 * The outer boundary at a ground distance from a spherically convex ring with great-circle sides: small circles
 * parallel to the sides, arcs about the corners or tangents squared off as in the plane. Vertices at most `edgeKm` apart.
 */
export const bufferSphere = (
  ring: Float64Array,
  bufferKm: number,
  edgeKm: number,
  corners: 'round' | 'square',
  radiusKm: number,
  projection: Stereographic,
): BufferedOutline => {
  const { corner, inward, along, length } = sidesOf(ring);
  const count = corner.length;
  const beta = bufferKm / radiusKm;
  const turning = new Float64Array(count);
  const stretches: Stretch[] = [];
  const plane = new Float64Array(2);
  const pushTo = (out: number[], p: Vector): void => {
    projection.forwardVector(p[0], p[1], p[2], plane, 0);
    out.push(plane[0], plane[1]);
  };
  // chords in the plane stay within 0.5 % of the buffer of the small circles they stand for
  const sideStep = Math.min(edgeKm, Math.sqrt(0.03 * bufferKm * radiusKm));
  const greatCircle = (a: Vector, b: Vector, isCorner: boolean): void => {
    const angle = angleOf(a, b);
    const tangent = unit(cross(cross(a, b), a));
    stretches.push({ length: angle * radiusKm, step: sideStep, bend: 0, isCorner, push: (share, out) => pushTo(out, towards(a, tangent, angle * share)) });
  };
  const outwards = inward.map(([x, y, z]): Vector => [-x, -y, -z]);
  for (let i = 0; i < count; i++) {
    const j = (i + 1) % count;
    const outward = outwards[i];
    const v = corner[j];
    const left = cross(v, outward);
    const angle = atan2(dot(left, outwards[j]), dot(outward, outwards[j]));
    turning[j] = angle;
    stretches.push({
      length: length[i] * cos(beta) * radiusKm,
      step: sideStep,
      bend: 0,
      isCorner: false,
      push: (share, out) => pushTo(out, towards(towards(corner[i], along[i], length[i] * share), outward, beta)),
    });
    const at = (phi: number, distance: number): Vector => towards(v, towards(outward, left, phi), distance);
    if (isRoundedCorner(corners, angle)) {
      const arcRadius = sin(beta) * radiusKm;
      stretches.push({
        length: angle * arcRadius,
        step: Math.min(edgeKm, ARC_STEP * arcRadius),
        bend: 1 / (radiusKm * tan(beta)),
        isCorner: false,
        push: (share, out) => pushTo(out, at(angle * share, beta)),
      });
    } else {
      const parts = Math.max(1, Math.ceil(angle / (PI / 2)));
      // right-angled spherical triangle: tan(leg) = tan(hypotenuse) cos(angle between)
      const reach = atan2(sin(beta), cos(beta) * cos(angle / (2 * parts)));
      for (let k = 0; k < parts; k++) {
        const tip = at((angle * (k + 0.5)) / parts, reach);
        greatCircle(at((angle * k) / parts, beta), tip, false);
        greatCircle(tip, at((angle * (k + 1)) / parts, beta), true);
      }
    }
  }
  return { ...layVertices(stretches), turning, isRounded: Array.from(turning, (angle) => isRoundedCorner(corners, angle)) };
};

/** Beyond this many radians the distance may have several least values along the outline. */
const FAR = 1.4;

/**
 * `DistanceOutside` for a convex ring on the sphere that holds the projection's centre, from positions in the
 * projection's plane: from the side in the position's direction, along the sides that face it.
 */
export const distanceOutsideSphere = (ring: Float64Array, radiusKm: number, projection: Stereographic): DistanceOutside => {
  const { corner, inward, along, length } = sidesOf(ring);
  const count = corner.length;
  const n = Float64Array.from(inward.flat());
  const t = Float64Array.from(along.flat());
  const c = Float64Array.from(corner.flat());
  const flat = new Float64Array(2 * count);
  for (let i = 0; i < count; i++) projection.forwardVector(c[3 * i], c[3 * i + 1], c[3 * i + 2], flat, 2 * i);
  const sideTowards = createSectorIndex(flat, 0, 0);
  const p = new Float64Array(3);
  const outOf = (i: number): number => -(p[0] * n[3 * i] + p[1] * n[3 * i + 1] + p[2] * n[3 * i + 2]);
  /** Where p's foot lies on side i: -1 before it, 0 on it, 1 beyond. */
  const placeOn = (i: number): number => {
    const a = p[0] * t[3 * i] + p[1] * t[3 * i + 1] + p[2] * t[3 * i + 2];
    if (a < 0) return -1;
    return atan2(a, p[0] * c[3 * i] + p[1] * c[3 * i + 1] + p[2] * c[3 * i + 2]) > length[i] ? 1 : 0;
  };
  const toSide = (i: number): number => {
    const out = outOf(i);
    return asin(out > 1 ? 1 : out > 0 ? out : 0);
  };
  const toCorner = (i: number): number => {
    const dx = p[0] - c[3 * i], dy = p[1] - c[3 * i + 1], dz = p[2] - c[3 * i + 2];
    const chord2 = dx * dx + dy * dy + dz * dz;
    return 2 * asin(chord2 >= 4 ? 1 : Math.sqrt(chord2) / 2);
  };
  const leastOfAll = (): number => {
    let nearest = Infinity;
    for (let i = 0; i < count; i++) {
      if (outOf(i) <= 0) continue;
      const place = placeOn(i);
      const d = place === 0 ? toSide(i) : toCorner(place < 0 ? i : (i + 1) % count);
      if (d < nearest) nearest = d;
    }
    return nearest === Infinity ? 0 : nearest;
  };
  const angleOutside = (x: number, y: number): number => {
    let i = sideTowards(x, y);
    if (outOf(i) <= 0) return 0;
    let heading = 0;
    for (let step = 0; step < count; step++) {
      const next = placeOn(i);
      if (next === 0) return toSide(i);
      if (heading + next === 0) return toCorner(next < 0 ? i : (i + 1) % count);
      heading = next;
      i = (i + next + count) % count;
    }
    return Infinity;
  };
  return (x, y) => {
    projection.inverseVector(x, y, p, 0);
    const angle = angleOutside(x, y);
    return (angle < FAR ? angle : leastOfAll()) * radiusKm;
  };
};
