import { NumericalError } from '#core/errors.ts';
import { convexHull } from '#core/geometry/convex-hull.ts';
import { cosDegrees, degrees, atan2 } from '#core/geometry/deterministic-math.ts';
import type { BufferedOutline, DistanceOutside } from '#core/geometry/plane-outline.ts';
import { bufferPlane, distanceOutsidePlane } from '#core/geometry/plane-outline.ts';
import { planeDistance, vectorLength } from '#core/geometry/distance.ts';
import { greatCircleKm, writeLonLat, writeUnitVector } from '#core/geometry/sphere.ts';
import { bufferSphere, distanceOutsideSphere } from '#core/geometry/sphere-outline.ts';
import type { Stereographic } from '#core/geometry/stereographic.ts';
import { createStereographicFrame } from '#core/geometry/stereographic.ts';

import type { OutlineCorner, SelectedObservations } from './designed-mesh.ts';
import type { Outline } from './recipe.ts';

/** The outline of an observation set, and the plane that it is triangulated in. */
export interface Domain {
  /** Plane coordinates of the observations, 2 per observation: km, on the sphere of a stereographic projection. */
  points: Float64Array;
  projection: Stereographic | null;
  /** Outline corners in the set's own coordinates, 2 per corner, counter-clockwise. */
  outline: Float64Array;
  /** Corners as in `outline`; `turning` and `isRounded` are filled from the buffer. */
  corners: OutlineCorner[];
  /** Length of the outline on the ground, km. */
  perimeterKm: number;
  distanceOutside: DistanceOutside;
  buffer(bufferKm: number, edgeKm: number, corners: 'round' | 'square'): BufferedOutline;
}

/** Widest angle from the middle of the observations to the farthest: beyond it a great-circle hull has no inside. */
const WIDEST_DATA = 80;
/** Widest angle from the middle to the outer boundary: beyond it the projection stretches too far. */
const WIDEST_DOMAIN = 140;

/**
 * The domain that an outline gives: the convex hull (on the sphere with great-circle sides), or the smallest box with
 * sides along x and y (on the sphere: great circles that run east and north at the middle of the observations).
 * @throws NumericalError TOO_FEW_POINTS, POINTS_COLLINEAR, POINTS_TOO_WIDE.
 */
export const createDomain = (selected: SelectedObservations, outline: Outline, radiusKm: number): Domain => {
  const count = selected.x.length;
  if (outline.kind === 'convex' && count < 3)
    throw new NumericalError(
      'TOO_FEW_POINTS',
      `${count === 1 ? 'One observation has' : `${count} observations have`} no convex hull with an inside. Select at least three observations that do not lie on one line.`,
      { details: { observations: count } },
    );
  return selected.crs === 'plane-km' ? planeDomain(selected, outline) : sphereDomain(selected, outline, radiusKm);
};

const collinear = (kind: Outline['kind']): NumericalError =>
  kind === 'convex'
    ? new NumericalError(
        'POINTS_COLLINEAR',
        'All the observations lie on one line, so their convex hull has no inside. Add an observation off that line, or choose the box.',
      )
    : new NumericalError(
        'POINTS_COLLINEAR',
        'All the observations lie on one line along a side of the box, so the box has no inside. Add an observation off that line.',
      );

const cornersOf = (outline: Float64Array, observations: ArrayLike<number> | null): OutlineCorner[] =>
  Array.from({ length: outline.length / 2 }, (_, i) => ({
    observation: observations ? observations[i] : -1,
    x: outline[2 * i],
    y: outline[2 * i + 1],
    turning: 0,
    isRounded: false,
  }));

const perimeterOf = (ring: Float64Array, distance: (ax: number, ay: number, bx: number, by: number) => number): number => {
  let sum = 0;
  for (let k = 0; k < ring.length; k += 2) {
    const next = (k + 2) % ring.length;
    sum += distance(ring[k], ring[k + 1], ring[next], ring[next + 1]);
  }
  return sum;
};

interface Ring {
  /** 2 per corner, in the coordinates of the points. */
  ring: Float64Array;
  hull: Uint32Array | null;
}

/** Outline of plane points; narrower than 1e-9 of its length it counts as a line. */
const ringOf = (points: Float64Array, kind: Outline['kind']): Ring => {
  const hull = convexHull(points);
  const ring = new Float64Array(2 * hull.length);
  for (const [k, i] of hull.entries()) {
    ring[2 * k] = points[2 * i];
    ring[2 * k + 1] = points[2 * i + 1];
  }
  let [west, south, east, north] = [Infinity, Infinity, -Infinity, -Infinity];
  for (let k = 0; k < ring.length; k += 2) {
    west = Math.min(west, ring[k]);
    east = Math.max(east, ring[k]);
    south = Math.min(south, ring[k + 1]);
    north = Math.max(north, ring[k + 1]);
  }
  const extent = Math.max(east - west, north - south);
  if (kind === 'box') {
    if (!(Math.min(east - west, north - south) > 1e-9 * extent)) throw collinear(kind);
    return { ring: Float64Array.of(west, south, east, south, east, north, west, north), hull: null };
  }
  let area = 0;
  for (let k = 2; k + 3 < ring.length; k += 2)
    area += (ring[k] - ring[0]) * (ring[k + 3] - ring[1]) - (ring[k + 2] - ring[0]) * (ring[k + 1] - ring[1]);
  if (hull.length < 3 || !(area > 1e-9 * extent * extent)) throw collinear(kind);
  return { ring, hull };
};

const planeDomain = (selected: SelectedObservations, outline: Outline): Domain => {
  const points = new Float64Array(2 * selected.x.length);
  for (let i = 0; i < selected.x.length; i++) {
    points[2 * i] = selected.x[i];
    points[2 * i + 1] = selected.y[i];
  }
  const { ring, hull } = ringOf(points, outline.kind);
  const corners = cornersOf(ring, hull);
  return {
    points,
    projection: null,
    outline: ring,
    corners,
    perimeterKm: perimeterOf(ring, planeDistance),
    distanceOutside: distanceOutsidePlane(ring),
    buffer: (bufferKm, edgeKm, kind) => withTurning(bufferPlane(ring, bufferKm, edgeKm, kind), corners),
  };
};

const withTurning = (buffered: BufferedOutline, corners: OutlineCorner[]): BufferedOutline => {
  for (const [i, corner] of corners.entries()) Object.assign(corner, { turning: buffered.turning[i], isRounded: buffered.isRounded[i] });
  return buffered;
};

/** Frame of the projection, from the data alone so that turning all observations turns it along. */
const dataFrame = (vectors: Float64Array, kind: Outline['kind']): { centre: Float64Array; east: Float64Array; widest: number } => {
  const centre = new Float64Array(3);
  for (let k = 0; k < vectors.length; k++) centre[k % 3] += vectors[k];
  const length = vectorLength(centre);
  if (!(length > 1e-6 * (vectors.length / 3))) throw tooWide();
  for (let k = 0; k < 3; k++) centre[k] /= length;
  let farthest = 0;
  let least = 2;
  for (let k = 0; k < vectors.length; k += 3) {
    const c = vectors[k] * centre[0] + vectors[k + 1] * centre[1] + vectors[k + 2] * centre[2];
    if (c < least) {
      least = c;
      farthest = k;
    }
  }
  if (least < cosDegrees(WIDEST_DATA)) throw tooWide();
  const sine = Math.sqrt(Math.max(0, 1 - least * least));
  // the hull's frame turns with the data (x axis to the farthest observation), the box's stands north up
  const aim = kind === 'convex' ? vectors.subarray(farthest, farthest + 3) : Float64Array.of(0, 0, 1);
  const along = aim[0] * centre[0] + aim[1] * centre[1] + aim[2] * centre[2];
  const axis = Float64Array.from(aim, (a, k) => a - along * centre[k]);
  let axisLength = vectorLength(axis);
  if (axisLength < 1e-12) {
    // the part of another axis of the globe that is at right angles to the centre
    const k = Math.abs(centre[2]) < 0.9 ? 2 : 0;
    axis.set(centre.map((c, j) => (j === k ? 1 : 0) - centre[k] * c));
    axisLength = vectorLength(axis);
  }
  for (let k = 0; k < 3; k++) axis[k] /= axisLength;
  const east =
    kind === 'convex'
      ? axis
      : Float64Array.of(axis[1] * centre[2] - axis[2] * centre[1], axis[2] * centre[0] - axis[0] * centre[2], axis[0] * centre[1] - axis[1] * centre[0]);
  return { centre, east, widest: degrees(atan2(sine, least)) };
};

const tooWide = (): NumericalError =>
  new NumericalError(
    'POINTS_TOO_WIDE',
    `The observations reach farther than ${WIDEST_DATA} degrees from their middle, so that they have no convex outline on the sphere. Select a smaller region with a polygon.`,
    { details: { limitDegrees: WIDEST_DATA } },
  );

const sphereDomain = (selected: SelectedObservations, outline: Outline, radiusKm: number): Domain => {
  const count = selected.x.length;
  const vectors = new Float64Array(3 * count);
  for (let i = 0; i < count; i++) writeUnitVector(selected.x[i], selected.y[i], vectors, 3 * i);
  const { centre, east, widest } = dataFrame(vectors, outline.kind);
  const projection = createStereographicFrame(centre, east, radiusKm);
  const points = new Float64Array(2 * count);
  const gnomonic = new Float64Array(2 * count);
  for (let i = 0; i < count; i++) {
    projection.forwardVector(vectors[3 * i], vectors[3 * i + 1], vectors[3 * i + 2], points, 2 * i);
    // great circles are straight lines of the gnomonic plane, whose radius is tan(c) where the stereographic is 2 tan(c/2)
    const x = points[2 * i] / (2 * radiusKm), y = points[2 * i + 1] / (2 * radiusKm);
    const stretch = 2 / (1 - (x * x + y * y));
    gnomonic[2 * i] = x * stretch;
    gnomonic[2 * i + 1] = y * stretch;
  }
  const { ring: flatRing, hull } = ringOf(gnomonic, outline.kind);
  const cornerCount = flatRing.length / 2;
  const ring = new Float64Array(3 * cornerCount);
  const outlineRing = new Float64Array(2 * cornerCount);
  for (let k = 0; k < cornerCount; k++) {
    if (hull) {
      ring.set(vectors.subarray(3 * hull[k], 3 * hull[k] + 3), 3 * k);
      outlineRing.set([selected.x[hull[k]], selected.y[hull[k]]], 2 * k);
      continue;
    }
    const x = flatRing[2 * k], y = flatRing[2 * k + 1];
    const r2 = x * x + y * y;
    const stretch = (2 * radiusKm) / (1 + Math.sqrt(1 + r2));
    projection.inverseVector(x * stretch, y * stretch, ring, 3 * k);
    writeLonLat(ring[3 * k], ring[3 * k + 1], ring[3 * k + 2], outlineRing, 2 * k);
  }
  const corners = cornersOf(outlineRing, hull);
  return {
    points,
    projection,
    outline: outlineRing,
    corners,
    perimeterKm: perimeterOf(outlineRing, (ax, ay, bx, by) => greatCircleKm(ax, ay, bx, by, radiusKm)),
    distanceOutside: distanceOutsideSphere(ring, radiusKm, projection),
    buffer: (bufferKm, edgeKm, kind) => {
      const reach = widest + degrees(bufferKm / radiusKm) * (kind === 'square' ? 1.42 : 1);
      if (reach > WIDEST_DOMAIN)
        throw new NumericalError(
          'POINTS_TOO_WIDE',
          `With this buffer the domain would reach ${Math.round(reach)} degrees from the middle of the observations; ${WIDEST_DOMAIN} is the most. Use a smaller buffer, or select a smaller region.`,
          { details: { reachDegrees: reach, limitDegrees: WIDEST_DOMAIN } },
        );
      return withTurning(bufferSphere(ring, bufferKm, edgeKm, kind, radiusKm, projection), corners);
    },
  };
};
