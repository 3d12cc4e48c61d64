/** Meshes of the domains on which the prediction is compared: each bounded, and continued outwards by elements only. */
import type { BoundaryMesh } from '#core/correlation/boundary-segments.ts';
import type { PlaneMesh } from './banded-operator.ts';

export interface Domain {
  bounded: PlaneMesh;
  /** The same nodes first, then those of the continuation. */
  continued: PlaneMesh;
  /** Bounded mesh's node -> continued mesh's node. */
  same(node: number): number;
  boundary: BoundaryMesh;
  /** Node of the observation in the bounded mesh. */
  observation: number;
}

/** A boundary from closed polygons (the domain on the left) and the curvature of each of their edges. */
export function boundaryOf(loops: { x: number[]; y: number[]; curvature: number[] }[]): BoundaryMesh {
  const coordinates: number[] = [];
  const curvature: number[] = [];
  const boundaryLoops = loops.map((loop) => {
    const first = coordinates.length / 2;
    loop.x.forEach((x, k) => coordinates.push(x, loop.y[k]));
    curvature.push(...loop.curvature);
    return Uint32Array.from(loop.x, (_, k) => first + k);
  });
  return { crs: 'plane-km', radiusKm: 0, coordinates: Float64Array.from(coordinates), boundaryLoops, boundaryCurvature: Float64Array.from(curvature) };
}

/**
 * A domain that is star-shaped about the observation at the origin: the boundary is at distance `reach(angle)` and has
 * curvature `bend(angle)`. Rings of nodes shrink towards the origin; the continuation has the rings beyond.
 */
export function starDomain(reach: (angle: number) => number, bend: (angle: number) => number, rings: number, sectors: number, beyond: number): Domain {
  const angles = Array.from({ length: sectors }, (_, j) => (2 * Math.PI * (j + 0.5)) / sectors);
  const radii = angles.map(reach);
  const step = 1 / rings;
  const nearest = Math.min(...radii);
  const outer = rings + Math.ceil(beyond / (nearest * step));
  // a ring beyond the boundary lies further out by the same distance in every direction
  const radiusAt = (ring: number, j: number) => (ring <= rings ? radii[j] * ring * step : radii[j] + (ring - rings) * step * nearest);
  const build = (last: number): PlaneMesh => {
    const x: number[] = [];
    const y: number[] = [];
    const triangles: [number, number, number][] = [];
    for (let ring = last; ring >= 1; ring--)
      for (let j = 0; j < sectors; j++) {
        x.push(radiusAt(ring, j) * Math.cos(angles[j]));
        y.push(radiusAt(ring, j) * Math.sin(angles[j]));
      }
    x.push(0);
    y.push(0);
    for (let k = 0; k < last; k++)
      for (let j = 0; j < sectors; j++) {
        const a = k * sectors + j;
        const b = k * sectors + ((j + 1) % sectors);
        if (k === last - 1) {
          triangles.push([a, b, last * sectors]);
          continue;
        }
        triangles.push([a, b, a + sectors], [b, b + sectors, a + sectors]);
      }
    return { x, y, triangles };
  };
  const bounded = build(rings);
  return {
    bounded,
    continued: build(outer),
    same: (node) => node + (outer - rings) * sectors,
    boundary: boundaryOf([{ x: bounded.x.slice(0, sectors), y: bounded.y.slice(0, sectors), curvature: angles.map((a) => bend(a + Math.PI / sectors)) }]),
    observation: rings * sectors,
  };
}

/** Distance from the origin, in a direction, to the nearest of straight lines at distance d with normal at `angle`. */
export const wallReach = (walls: { angle: number; distance: number }[], farthest: number) => (direction: number): number =>
  walls.reduce((least, wall) => {
    const cosine = Math.cos(direction - wall.angle);
    return cosine > 0 ? Math.min(least, wall.distance / cosine) : least;
  }, farthest);

/**
 * A round hole of radius a in a wide domain, observation at distance d from its edge; the continuation fills the hole.
 */
export function holeDomain(a: number, d: number, h: number, width: number, sectors: number): Domain {
  const inner = Math.max(2, Math.round(a / h));
  const outer = Math.round(width / h);
  const at = Math.round(d / h);
  const build = (first: number): PlaneMesh => {
    const x: number[] = [];
    const y: number[] = [];
    const triangles: [number, number, number][] = [];
    const radii: number[] = [];
    for (let k = outer; k >= 0; k--) radii.push(a + k * (d / at));
    for (let k = inner - 1; k >= first; k--) radii.push((a * k) / inner);
    for (const r of radii)
      for (let j = 0; j < sectors; j++) {
        x.push(r * Math.cos((2 * Math.PI * j) / sectors));
        y.push(r * Math.sin((2 * Math.PI * j) / sectors));
      }
    for (let k = 0; k + 1 < radii.length; k++)
      for (let j = 0; j < sectors; j++) {
        const p = k * sectors + j;
        const q = k * sectors + ((j + 1) % sectors);
        triangles.push([p, q, p + sectors], [q, q + sectors, p + sectors]);
      }
    if (first === 1) {
      x.push(0);
      y.push(0);
      for (let j = 0; j < sectors; j++) triangles.push([(radii.length - 1) * sectors + j, (radii.length - 1) * sectors + ((j + 1) % sectors), x.length - 1]);
    }
    return { x, y, triangles };
  };
  const edge = {
    x: Array.from({ length: sectors }, (_, j) => a * Math.cos((2 * Math.PI * j) / sectors)),
    y: Array.from({ length: sectors }, (_, j) => -a * Math.sin((2 * Math.PI * j) / sectors)),
    curvature: new Array<number>(sectors).fill(-1 / a),
  };
  return {
    bounded: build(inner),
    continued: build(1),
    same: (node) => node,
    // the outer wall is in both meshes, so only the hole counts
    boundary: boundaryOf([edge]),
    observation: (outer - at) * sectors,
  };
}

/** A grid with the quadrant x > 0, y > 0 cut away (interior angle 270 degrees at the origin); the continuation fills it. */
export function reentrantDomain(ox: number, oy: number, h: number, width: number): Domain {
  const half = Math.round(width / h);
  const build = (isInside: (i: number, j: number) => boolean) => {
    const x: number[] = [];
    const y: number[] = [];
    const triangles: [number, number, number][] = [];
    const id = new Map<string, number>();
    const node = (i: number, j: number) => {
      const known = id.get(`${i},${j}`);
      if (known === undefined) throw new Error(`No node ${i}, ${j}`);
      return known;
    };
    const touches = (i: number, j: number) => isInside(i, j) || isInside(i - 1, j) || isInside(i, j - 1) || isInside(i - 1, j - 1);
    for (let j = -half; j <= half; j++)
      for (let i = -half; i <= half; i++) {
        if (!touches(i, j)) continue;
        id.set(`${i},${j}`, x.length);
        x.push(i * h);
        y.push(j * h);
      }
    for (let j = -half; j < half; j++)
      for (let i = -half; i < half; i++) {
        if (!isInside(i, j)) continue;
        // alternate the diagonals, so that no direction is preferred
        if ((i + j) % 2 === 0) triangles.push([node(i, j), node(i + 1, j), node(i + 1, j + 1)], [node(i, j), node(i + 1, j + 1), node(i, j + 1)]);
        else triangles.push([node(i, j), node(i + 1, j), node(i, j + 1)], [node(i + 1, j), node(i + 1, j + 1), node(i, j + 1)]);
      }
    return { mesh: { x, y, triangles }, node };
  };
  const within = (i: number, j: number) => i >= -half && i < half && j >= -half && j < half;
  const cut = build((i, j) => within(i, j) && !(i >= 0 && j >= 0));
  const whole = build(within);
  // the outer wall is in both meshes, so it is moved out of reach of the prediction
  const w = 100;
  const [i, j] = [Math.round(ox / h), Math.round(oy / h)];
  return {
    bounded: cut.mesh,
    continued: whole.mesh,
    same: (n) => whole.node(Math.round(cut.mesh.x[n] / h), Math.round(cut.mesh.y[n] / h)),
    boundary: boundaryOf([{ x: [-w, w, w, 0, 0, -w], y: [-w, -w, 0, 0, w, w], curvature: [0, 0, 0, 0, 0, 0] }]),
    observation: cut.node(i, j),
  };
}
