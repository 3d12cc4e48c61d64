import type { CoordinateReference } from '#core/geometry/mesh.ts';

type Vector = [number, number, number];

const RAD = Math.PI / 180;
const dot = (a: Vector, b: Vector): number => a[0] * b[0] + a[1] * b[1] + a[2] * b[2];
const cross = (a: Vector, b: Vector): Vector => [a[1] * b[2] - a[2] * b[1], a[2] * b[0] - a[0] * b[2], a[0] * b[1] - a[1] * b[0]];
const unit = (a: Vector): Vector => {
  const length = Math.hypot(...a);
  return [a[0] / length, a[1] / length, a[2] / length];
};
export const angleBetween = (a: Vector, b: Vector): number => Math.atan2(Math.hypot(...cross(a, b)), dot(a, b));
export const vectorOf = (lon: number, lat: number): Vector => [Math.cos(lat * RAD) * Math.cos(lon * RAD), Math.cos(lat * RAD) * Math.sin(lon * RAD), Math.sin(lat * RAD)];

/** Angle from p to the great-circle arc from a to b. */
const angleToArc = (p: Vector, a: Vector, b: Vector): number => {
  const n = unit(cross(a, b));
  const height = dot(p, n);
  const foot = unit([p[0] - height * n[0], p[1] - height * n[1], p[2] - height * n[2]]);
  const isOnArc = dot(cross(a, foot), n) >= 0 && dot(cross(foot, b), n) >= 0;
  return isOnArc ? angleBetween(p, foot) : Math.min(angleBetween(p, a), angleBetween(p, b));
};

const distanceToSegment = (x: number, y: number, ax: number, ay: number, bx: number, by: number): number => {
  const [dx, dy] = [bx - ax, by - ay];
  const share = Math.max(0, Math.min(1, ((x - ax) * dx + (y - ay) * dy) / (dx * dx + dy * dy)));
  return Math.hypot(x - ax - share * dx, y - ay - share * dy);
};

/** Distance in km from a place to the nearest side of a ring of the same coordinates, side by side with the platform's functions. */
export const distanceToRing = (crs: CoordinateReference, ring: Float64Array, x: number, y: number, radiusKm: number): number => {
  let least = Infinity;
  for (let k = 0; k < ring.length; k += 2) {
    const [ax, ay, bx, by] = [ring[k], ring[k + 1], ring[(k + 2) % ring.length], ring[(k + 3) % ring.length]];
    const d = crs === 'plane-km' ? distanceToSegment(x, y, ax, ay, bx, by) : radiusKm * angleToArc(vectorOf(x, y), vectorOf(ax, ay), vectorOf(bx, by));
    least = Math.min(least, d);
  }
  return least;
};

/** A place at a share of the straight way from a to b, on the sphere along the great circle. */
export const placeBetween = (crs: CoordinateReference, [ax, ay]: [number, number], [bx, by]: [number, number], share: number): [number, number] => {
  if (crs === 'plane-km') return [ax + share * (bx - ax), ay + share * (by - ay)];
  const a = vectorOf(ax, ay);
  const b = vectorOf(bx, by);
  const p = unit([a[0] + share * (b[0] - a[0]), a[1] + share * (b[1] - a[1]), a[2] + share * (b[2] - a[2])]);
  return [Math.atan2(p[1], p[0]) / RAD, Math.asin(p[2]) / RAD];
};
