import { NumericalError } from '#core/errors.ts';
import { vectorLength } from '#core/geometry/distance.ts';
import type { CoordinateReference } from '#core/geometry/mesh.ts';
import { greatCircleKm, writeLonLat, writeUnitVector } from '#core/geometry/sphere.ts';
import { createStereographic } from '#core/geometry/stereographic.ts';

import { clipVoronoi } from './clipped-voronoi.ts';
import { createPointGrid } from './point-grid.ts';

export interface LocalSpacing {
  /** Per point, km; see `localSpacing`. */
  spacingKm: Float64Array;
  /** Area of each point's clipped cell on the ground, km²; points in one place share one cell. */
  cellAreaKm2: Float64Array;
  /** With `withCells`: the cells' corners in the points' coordinates, 2 per corner; cell i starts at corner start[i]. */
  cells?: { start: Uint32Array; coordinates: Float64Array };
}

interface Points {
  crs: CoordinateReference;
  x: Float64Array;
  y: Float64Array;
}

/** Plane coordinates about a million across, 2 per point, and the way back to the ground. */
interface Flattened {
  points: Float64Array;
  /** Ground km per plane unit at a plane position. */
  groundScale(x: number, y: number): number;
  /** Position in the points' own coordinates. */
  unflatten(x: number, y: number, out: Float64Array, at: number): void;
  groundDistance(i: number, j: number): number;
}

const EXTENT = 2 ** 20;
/** Points closer than this are one place: the triangulation does not keep such pairs apart reliably. */
const ONE_PLACE = 2 ** -12;
/** A smaller extent in km is no distance: its square would underflow. */
const SMALLEST_EXTENT = 1e-100;

/** A set narrower than this share of its length counts as a line. */
const NARROWEST = 1e-9;

/** Side of a square that has the area of the disc whose diameter is 1. */
const DISC_SIDE = Math.sqrt(Math.PI) / 2;

/**
 * Spacing of each point from its neighbours: the square root of its Voronoi cell's area, the cell clipped by the
 * convex hull of all points. A cell that the hull does not clip holds the disc of half the distance d to the nearest
 * other point, so its spacing is at least sqrt(pi)/2 d; clipped cells, which may be slivers, are given no less.
 * On the sphere the cells are those of a stereographic projection (conformal, so locally the cells of the ground) and
 * areas are divided by the squared scale at the cell's centroid.
 *
 * Points in one place (within 2^-32 of the set's extent) share a spacing. Points on one line have cells without area: sqrt(pi)/2 d remains. A single
 * place has no spacing: 0.
 * @throws NumericalError INPUT_NOT_FINITE naming the point.
 */
export const localSpacing = (
  points: Points,
  radiusKm: number,
  { withCells = false }: { withCells?: boolean } = {},
): LocalSpacing => {
  const count = points.x.length;
  for (let i = 0; i < count; i++)
    if (!Number.isFinite(points.x[i]) || !Number.isFinite(points.y[i]))
      throw new NumericalError('INPUT_NOT_FINITE', `Point ${i} has no finite position. Leave it out.`, { details: { index: i } });

  const flat = points.crs === 'plane-km' ? flattenPlane(points) : flattenSphere(points, radiusKm);
  const { placeOf, places } = findPlaces(flat.points);
  const positions = new Float64Array(2 * places.length);
  for (const [place, i] of places.entries()) positions.set(flat.points.subarray(2 * i, 2 * i + 2), 2 * place);
  const distance = (a: number, b: number): number => flat.groundDistance(places[a], places[b]);
  const spacing = new Float64Array(places.length);
  const areaKm2 = new Float64Array(places.length);
  let cellOf: (place: number) => number[] = () => [];
  const line = places.length < 3 ? lineOrder(positions) : findLine(positions);
  if (line) {
    for (let k = 0; k < line.length; k++) {
      const before = k > 0 ? distance(line[k - 1], line[k]) : Infinity;
      const after = k + 1 < line.length ? distance(line[k], line[k + 1]) : Infinity;
      const nearest = Math.min(before, after);
      spacing[line[k]] = nearest === Infinity ? 0 : DISC_SIDE * nearest;
    }
  } else {
    const voronoi = clipVoronoi(positions);
    cellOf = voronoi.cell;
    for (let place = 0; place < places.length; place++) {
      const scale = flat.groundScale(voronoi.centroid[2 * place], voronoi.centroid[2 * place + 1]);
      areaKm2[place] = voronoi.area[place] * scale * scale;
      spacing[place] = Math.max(Math.sqrt(areaKm2[place]), DISC_SIDE * distance(place, voronoi.nearest[place]));
    }
  }
  return {
    spacingKm: spread(spacing, placeOf),
    cellAreaKm2: spread(areaKm2, placeOf),
    ...(withCells && { cells: collectCells(placeOf, cellOf, flat) }),
  };
};

const spread = (values: Float64Array, placeOf: Uint32Array): Float64Array => {
  const out = new Float64Array(placeOf.length);
  for (let i = 0; i < out.length; i++) out[i] = values[placeOf[i]];
  return out;
};

/** Points that are apart: `places` holds the first point of each place, `placeOf` the place of each point. */
const findPlaces = (points: Float64Array): { placeOf: Uint32Array; places: number[] } => {
  const count = points.length / 2;
  const positions = new Float64Array(3 * count);
  for (let i = 0; i < count; i++) positions.set(points.subarray(2 * i, 2 * i + 2), 3 * i);
  const grid = createPointGrid(positions, ONE_PLACE, count, true);
  const places: number[] = [];
  const numberOf = new Uint32Array(count);
  for (let i = 0; i < count; i++) {
    if (grid.hasNear(i)) continue;
    numberOf[i] = places.length;
    places.push(i);
    grid.insert(i);
  }
  const placeOf = new Uint32Array(count);
  for (let i = 0; i < count; i++) placeOf[i] = numberOf[grid.nearest(i)];
  return { placeOf, places };
};

/** Moves the points' middle to the origin and scales their extent to EXTENT, by a power of two to keep their bits. */
const normalise = (points: Float64Array): { toUnit: number; ox: number; oy: number } => {
  let [west, south, east, north] = [Infinity, Infinity, -Infinity, -Infinity];
  for (let k = 0; k < points.length; k += 2) {
    west = Math.min(west, points[k]);
    east = Math.max(east, points[k]);
    south = Math.min(south, points[k + 1]);
    north = Math.max(north, points[k + 1]);
  }
  const extent = Math.max(east - west, north - south);
  let toUnit = 1;
  if (extent > SMALLEST_EXTENT && extent < Infinity) {
    while (extent * toUnit > EXTENT) toUnit /= 2;
    while (extent * toUnit < EXTENT / 2) toUnit *= 2;
  }
  const ox = west / 2 + east / 2;
  const oy = south / 2 + north / 2;
  for (let k = 0; k < points.length; k += 2) {
    points[k] = (points[k] - ox) * toUnit;
    points[k + 1] = (points[k + 1] - oy) * toUnit;
  }
  return { toUnit, ox, oy };
};

const flattenPlane = ({ x, y }: Points): Flattened => {
  const points = new Float64Array(2 * x.length);
  for (let i = 0; i < x.length; i++) {
    points[2 * i] = x[i];
    points[2 * i + 1] = y[i];
  }
  const { toUnit, ox, oy } = normalise(points);
  return {
    points,
    groundScale: () => 1 / toUnit,
    unflatten: (px, py, out, at) => {
      out[at] = px / toUnit + ox;
      out[at + 1] = py / toUnit + oy;
    },
    groundDistance: (i, j) => {
      const dx = (points[2 * i] - points[2 * j]) / toUnit;
      const dy = (points[2 * i + 1] - points[2 * j + 1]) / toUnit;
      return Math.sqrt(dx * dx + dy * dy);
    },
  };
};

const flattenSphere = ({ x: lon, y: lat }: Points, radiusKm: number): Flattened => {
  const [centreLon, centreLat] = chooseCentre(lon, lat);
  const projection = createStereographic(centreLon, centreLat, radiusKm);
  const points = new Float64Array(2 * lon.length);
  for (let i = 0; i < lon.length; i++) projection.forward(lon[i], lat[i], points, 2 * i);
  const { toUnit, ox, oy } = normalise(points);
  return {
    points,
    groundScale: (px, py) => 1 / (toUnit * projection.scaleAt(px / toUnit + ox, py / toUnit + oy)),
    unflatten: (px, py, out, at) => projection.inverse(px / toUnit + ox, py / toUnit + oy, out, at),
    groundDistance: (i, j) => greatCircleKm(lon[i], lat[i], lon[j], lat[j], radiusKm),
  };
};

/** Cosine of the angle from a centre's antipode within which its projection would stretch points too far: 30 degrees. */
const ANTIPODE_CLEARANCE = Math.sqrt(3) / 2;

/** Centres to try where the mean direction will not do: the axes and the corners of a cube, seen from its middle. */
const SPARE_CENTRES: [number, number][] = [
  [0, 0], [90, 0], [-180, 0], [-90, 0], [0, 90], [0, -90],
  [45, 35], [135, 35], [-135, 35], [-45, 35], [45, -35], [135, -35], [-135, -35], [-45, -35],
];

/** The direction of the points' mean, unless a point lies near its antipode: then the spare centre farthest from that. */
const chooseCentre = (lon: Float64Array, lat: Float64Array): [number, number] => {
  const vectors = new Float64Array(3 * lon.length);
  const mean = new Float64Array(3);
  for (let i = 0; i < lon.length; i++) {
    writeUnitVector(lon[i], lat[i], vectors, 3 * i);
    for (let k = 0; k < 3; k++) mean[k] += vectors[3 * i + k];
  }
  const length = vectorLength(mean);
  if (length > 0) {
    const direction = mean.map((component) => component / length);
    if (antipodeCosine(direction, vectors) < ANTIPODE_CLEARANCE) {
      const centre = new Float64Array(2);
      writeLonLat(direction[0], direction[1], direction[2], centre, 0);
      return [centre[0], centre[1]];
    }
  }
  let best = SPARE_CENTRES[0];
  let least = Infinity;
  const direction = new Float64Array(3);
  for (const centre of SPARE_CENTRES) {
    writeUnitVector(centre[0], centre[1], direction, 0);
    const cosine = antipodeCosine(direction, vectors);
    if (cosine >= least) continue;
    least = cosine;
    best = centre;
  }
  return best;
};

const antipodeCosine = (direction: Float64Array, vectors: Float64Array): number => {
  let most = -1;
  for (let k = 0; k < vectors.length; k += 3)
    most = Math.max(most, -(direction[0] * vectors[k] + direction[1] * vectors[k + 1] + direction[2] * vectors[k + 2]));
  return most;
};

/** Plane order of points on a line, from its one end to the other. */
const lineOrder = (points: Float64Array): number[] => {
  const order = Array.from({ length: points.length / 2 }, (_, i) => i);
  const a = farthestFrom(points, 0, 0);
  const b = farthestFrom(points, points[2 * a], points[2 * a + 1]);
  const dx = points[2 * b] - points[2 * a];
  const dy = points[2 * b + 1] - points[2 * a + 1];
  const along = order.map((i) => dx * points[2 * i] + dy * points[2 * i + 1]);
  return order.sort((i, j) => along[i] - along[j] || i - j);
};

/** The order along the line where the points lie on one, else null. */
const findLine = (points: Float64Array): number[] | null => {
  const a = farthestFrom(points, 0, 0);
  const b = farthestFrom(points, points[2 * a], points[2 * a + 1]);
  const dx = points[2 * b] - points[2 * a];
  const dy = points[2 * b + 1] - points[2 * a + 1];
  const length2 = dx * dx + dy * dy;
  for (let k = 0; k < points.length; k += 2) {
    const cross = dx * (points[k + 1] - points[2 * a + 1]) - dy * (points[k] - points[2 * a]);
    if (Math.abs(cross) > NARROWEST * length2) return null;
  }
  return lineOrder(points);
};

const farthestFrom = (points: Float64Array, x: number, y: number): number => {
  let farthest = 0;
  let most = -1;
  for (let k = 0; k < points.length; k += 2) {
    const dx = points[k] - x;
    const dy = points[k + 1] - y;
    const distance2 = dx * dx + dy * dy;
    if (distance2 <= most) continue;
    most = distance2;
    farthest = k / 2;
  }
  return farthest;
};

const collectCells = (placeOf: Uint32Array, cellOf: (place: number) => number[], flat: Flattened): LocalSpacing['cells'] => {
  const rings = Array.from(placeOf, (place) => cellOf(place));
  const start = new Uint32Array(rings.length + 1);
  for (const [i, ring] of rings.entries()) start[i + 1] = start[i] + ring.length / 2;
  const coordinates = new Float64Array(2 * start[rings.length]);
  for (const [i, ring] of rings.entries())
    for (let k = 0; k < ring.length; k += 2) flat.unflatten(ring[k], ring[k + 1], coordinates, 2 * start[i] + k);
  return { start, coordinates };
};

/** Filler nodes that the derived core spacing may cost: per observation, and in any case. */
const MOST_FILLERS_PER_OBSERVATION = 8;
const FILLERS_ALWAYS_ALLOWED = 20_000;

/**
 * Core spacing for a set of local spacings, km: their median, so that half of the observations are at least as dense;
 * but never so small that filling the hull, whose area is the sum of the squared spacings, would take more than 8
 * nodes per observation (or 20,000 in all, if that is more), as where most observations crowd into a corner.
 * @throws NumericalError TOO_FEW_POINTS when all observations are in one place.
 */
export const derivedCoreSpacing = (spacingKm: Float64Array): number => {
  const sorted = spacingKm.filter((s) => s > 0).sort();
  if (sorted.length === 0)
    throw new NumericalError(
      'TOO_FEW_POINTS',
      'All observations are in one place, so that they have no spacing. Give the core spacing in km, or add observations.',
    );
  let area = 0;
  for (const s of sorted) area += s * s;
  const fillers = Math.max(FILLERS_ALWAYS_ALLOWED, MOST_FILLERS_PER_OBSERVATION * sorted.length);
  return Math.max(sorted[(sorted.length - 1) >> 1], Math.sqrt(area / fillers));
};
