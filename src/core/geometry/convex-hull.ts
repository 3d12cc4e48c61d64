import { orient2d } from 'robust-predicates';

/**
 * Convex hull of plane points (2 numbers each) by Andrew's monotone chain (1979): indices counter-clockwise with y
 * up, without points on its sides. Fewer than 3 indices when the points are collinear. Exact for the given doubles.
 */
export const convexHull = (points: Float64Array): Uint32Array => {
  const count = points.length / 2;
  const order = Uint32Array.from({ length: count }, (_, i) => i);
  order.sort((i, j) => points[2 * i] - points[2 * j] || points[2 * i + 1] - points[2 * j + 1] || i - j);
  const chain = (from: Uint32Array): number[] => {
    const kept: number[] = [];
    for (const i of from) {
      if (kept.length > 0 && samePlace(points, kept[kept.length - 1], i)) continue;
      while (kept.length >= 2 && !turnsLeft(points, kept[kept.length - 2], kept[kept.length - 1], i)) kept.pop();
      kept.push(i);
    }
    return kept;
  };
  const lower = chain(order);
  const upper = chain(order.reverse());
  if (lower.length < 2) return Uint32Array.from(lower);
  return Uint32Array.from([...lower.slice(0, -1), ...upper.slice(0, -1)]);
};

const samePlace = (p: Float64Array, i: number, j: number): boolean => p[2 * i] === p[2 * j] && p[2 * i + 1] === p[2 * j + 1];

const turnsLeft = (p: Float64Array, a: number, b: number, c: number): boolean =>
  orient2d(p[2 * a], p[2 * a + 1], p[2 * b], p[2 * b + 1], p[2 * c], p[2 * c + 1]) < 0;
