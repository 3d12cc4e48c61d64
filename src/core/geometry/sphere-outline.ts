import { asin, atan2, cos, sin, tan, PI } from './deterministic-math.ts';
import type { BufferedOutline, DistanceOutside } from './plane-outline.ts';
import { ARC_STEP, SHORT_ARC } from './plane-outline.ts';
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
  const points: number[] = [];
  const curvature: number[] = [];
  const turning = new Float64Array(count);
  const plane = new Float64Array(2);
  const push = (p: Vector, bend: number): void => {
    projection.forwardVector(p[0], p[1], p[2], plane, 0);
    points.push(plane[0], plane[1]);
    curvature.push(bend);
  };
  const offset = (q: Vector, outward: Vector, distance: number): Vector => towards(q, outward, distance);
  // chords in the plane stay within 0.5 % of the buffer of the small circles they stand for
  const sideStep = Math.min(edgeKm, Math.sqrt(0.03 * bufferKm * radiusKm));
  const greatCircle = (a: Vector, b: Vector): void => {
    const angle = angleOf(a, b);
    const tangent = unit(cross(cross(a, b), a));
    const steps = Math.max(1, Math.ceil((angle * radiusKm) / sideStep));
    for (let k = 0; k < steps; k++) push(towards(a, tangent, (angle * k) / steps), 0);
  };
  const outwardOf = (i: number): Vector => [-inward[i][0], -inward[i][1], -inward[i][2]];
  const angleAt = (j: number): number => {
    const from = outwardOf((j + count - 1) % count);
    return atan2(dot(cross(corner[j], from), outwardOf(j)), dot(from, outwardOf(j)));
  };
  const isShort = (angle: number): boolean => angle * sin(beta) * radiusKm < SHORT_ARC * edgeKm;
  for (let i = 0; i < count; i++) {
    const j = (i + 1) % count;
    const outward = outwardOf(i);
    const v = corner[j];
    const left = cross(v, outward);
    const angle = angleAt(j);
    turning[j] = angle;
    const steps = Math.max(1, Math.ceil((length[i] * radiusKm) / sideStep));
    // the side's first vertex moves to the middle of the short arc before it
    const before = angleAt(i);
    for (let k = 0; k < steps; k++) {
      if (k === 0 && isShort(before)) push(offset(corner[i], towards(outward, cross(corner[i], outward), -before / 2), beta), 0);
      else push(offset(towards(corner[i], along[i], (length[i] * k) / steps), outward, beta), 0);
    }
    if (isShort(angle)) continue;
    const at = (phi: number, distance: number): Vector => offset(v, towards(outward, left, phi), distance);
    if (corners === 'round') {
      const arcSteps = Math.max(1, Math.ceil(angle / ARC_STEP), Math.ceil((angle * sin(beta) * radiusKm) / edgeKm));
      const bend = 1 / (radiusKm * tan(beta));
      for (let k = 0; k < arcSteps; k++) push(at((angle * k) / arcSteps, beta), bend);
    } else {
      const parts = Math.max(1, Math.ceil(angle / (PI / 2)));
      // right-angled spherical triangle: tan(leg) = tan(hypotenuse) cos(angle between)
      const reach = atan2(sin(beta), cos(beta) * cos(angle / (2 * parts)));
      for (let k = 0; k < parts; k++) {
        const tip = at((angle * (k + 0.5)) / parts, reach);
        greatCircle(at((angle * k) / parts, beta), tip);
        greatCircle(tip, at((angle * (k + 1)) / parts, beta));
      }
    }
  }
  return { boundary: Float64Array.from(points), curvature: Float64Array.from(curvature), turning };
};

/** `DistanceOutside` for a convex ring on the sphere, from positions in the projection's plane. */
export const distanceOutsideSphere = (ring: Float64Array, radiusKm: number, projection: Stereographic): DistanceOutside => {
  const { corner, inward, along, length } = sidesOf(ring);
  const count = corner.length;
  const n = Float64Array.from(inward.flat());
  const t = Float64Array.from(along.flat());
  const c = Float64Array.from(corner.flat());
  const p = new Float64Array(3);
  return (x, y) => {
    projection.inverseVector(x, y, p, 0);
    let nearest = Infinity;
    for (let i = 0; i < 3 * count; i += 3) {
      const out = -(p[0] * n[i] + p[1] * n[i + 1] + p[2] * n[i + 2]);
      if (out <= 0) continue;
      const a = p[0] * t[i] + p[1] * t[i + 1] + p[2] * t[i + 2];
      const b = p[0] * c[i] + p[1] * c[i + 1] + p[2] * c[i + 2];
      const angle = a < 0 ? -1 : atan2(a, b);
      let d: number;
      if (angle >= 0 && angle <= length[i / 3]) d = asin(out > 1 ? 1 : out);
      else {
        const k = angle < 0 ? i : (i + 3) % (3 * count);
        const cosine = p[0] * c[k] + p[1] * c[k + 1] + p[2] * c[k + 2];
        const chord2 = 2 - 2 * cosine;
        d = 2 * asin(chord2 >= 4 ? 1 : Math.sqrt(chord2 > 0 ? chord2 : 0) / 2);
      }
      if (d < nearest) nearest = d;
    }
    return nearest === Infinity ? 0 : nearest * radiusKm;
  };
};
