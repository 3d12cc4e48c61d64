import { orient2d } from 'robust-predicates';

import { NumericalError } from '#core/errors.ts';
import type { CoordinateReference } from '#core/geometry/mesh.ts';

import type { Ring } from './recipe.ts';

/**
 * A test of whether a position lies in the polygon of a ring, its edges included, by the even-odd rule with exact
 * orientations (Shewchuk 1997).
 *
 * Longitude/latitude rings follow RFC 7946 section 3.1: an edge is a straight line in longitude and latitude, so a
 * parallel is an edge; it takes the shorter way round, so that rings may cross the antimeridian; a ring that goes
 * round a pole contains the pole on its side of the equator.
 * @throws NumericalError POLYGON_INVALID naming the corner at fault.
 */
export const createRingRegion = (ring: Ring, crs: CoordinateReference, name: string): ((x: number, y: number) => boolean) => {
  for (const [k, position] of ring.entries()) checkPosition(position, k, crs, name);
  const distinct = new Set(ring.map(([x, y]) => `${x} ${y}`)).size;
  if (distinct < 3)
    throw invalid(name, `has ${distinct} different corners`, 'Give at least three corners that are not in one place.');
  const corners = crs === 'lonlat-deg' ? unwrapRing(ring, name) : ring.flat();
  const isInside = createFlatRegion(corners);
  if (crs === 'plane-km') return isInside;

  let west = Infinity;
  let east = -Infinity;
  let highestLat = 0;
  let lowestLat = 0;
  for (let k = 0; k < corners.length; k += 2) {
    west = Math.min(west, corners[k]);
    east = Math.max(east, corners[k]);
    lowestLat = Math.min(lowestLat, corners[k + 1]);
    highestLat = Math.max(highestLat, corners[k + 1]);
  }
  return (lon, lat) => {
    // a pole has every longitude
    if (lat === 90) return highestLat === 90;
    if (lat === -90) return lowestLat === -90;
    for (let turn = Math.ceil((west - lon) / 360); lon + 360 * turn <= east; turn++)
      if (isInside(lon + 360 * turn, lat)) return true;
    return false;
  };
};

const invalid = (name: string, what: string, advice: string, details: Record<string, unknown> = {}): NumericalError =>
  new NumericalError('POLYGON_INVALID', `The polygon "${name}" ${what}. ${advice}`, { details: { polygon: name, ...details } });

const checkPosition = ([x, y]: [number, number], k: number, crs: CoordinateReference, name: string): void => {
  const where = `(${x}, ${y}) as corner ${k + 1}`;
  if (!Number.isFinite(x) || !Number.isFinite(y))
    throw invalid(name, `has ${where}`, 'Give two finite numbers for each corner.', { corner: k });
  if (crs === 'lonlat-deg' && (Math.abs(y) > 90 || Math.abs(x) > 360))
    throw invalid(name, `has ${where}`, 'A longitude lies within ±360° and a latitude within ±90°.', { corner: k });
};

/** Flat corners whose longitudes run on without a jump, closed round the pole where the ring goes round one. */
const unwrapRing = (ring: Ring, name: string): number[] => {
  const corners = [...ring[0]];
  let twiceMeanLat = 0;
  let lon = ring[0][0];
  for (let k = 0; k < ring.length; k++) {
    const [, lat] = ring[k];
    const [nextLon, nextLat] = ring[(k + 1) % ring.length];
    const step = shorterStep(nextLon - ring[k][0], k, name, ring.length);
    // a corner that needs no turn keeps its own bits
    const unwrapped = step === nextLon - ring[k][0] && lon === ring[k][0] ? nextLon : lon + step;
    twiceMeanLat += step * (lat + nextLat);
    lon = unwrapped;
    if (k < ring.length - 1) corners.push(lon, nextLat);
  }
  const turn = Math.round((lon - ring[0][0]) / 360);
  if (turn === 0) return corners;
  if (Math.abs(turn) > 1) throw invalid(name, `goes ${Math.abs(turn)} times round a pole`, 'Draw it once round at most.');
  const pole = twiceMeanLat * turn >= 0 ? 90 : -90;
  const start = ring[0][0];
  corners.push(start + 360 * turn, ring[0][1], start + 360 * turn, pole, start, pole);
  return corners;
};

const shorterStep = (difference: number, k: number, name: string, count: number): number => {
  const turns = Math.round(difference / 360);
  const step = difference - 360 * turns;
  const isWholeTurn = step === 0 && turns !== 0;
  if (Math.abs(step) === 180 || isWholeTurn)
    throw invalid(
      name,
      `spans ${Math.abs(difference)}° of longitude from corner ${k + 1} to corner ${((k + 1) % count) + 1}, so neither way round is the shorter`,
      'Add a corner between the two.',
      { corner: k },
    );
  return step;
};

const MOST_SLABS = 256;

/** Even-odd rule over a closed flat ring, its edges sorted into slabs of y; a point on an edge is inside. */
const createFlatRegion = (corners: number[]): ((x: number, y: number) => boolean) => {
  const count = corners.length / 2;
  const south = corners.reduce((least, y, k) => (k % 2 ? Math.min(least, y) : least), Infinity);
  const north = corners.reduce((most, y, k) => (k % 2 ? Math.max(most, y) : most), -Infinity);
  const slabCount = Math.min(MOST_SLABS, count);
  const slabOf = (y: number): number =>
    north > south ? Math.min(slabCount - 1, Math.floor(((y - south) / (north - south)) * slabCount)) : 0;
  const slabs: number[][] = Array.from({ length: slabCount }, () => []);
  for (let k = 0; k < count; k++) {
    const ay = corners[2 * k + 1];
    const by = corners[2 * ((k + 1) % count) + 1];
    const last = slabOf(Math.max(ay, by));
    for (let slab = slabOf(Math.min(ay, by)); slab <= last; slab++) slabs[slab].push(k);
  }

  return (x, y) => {
    if (!(y >= south && y <= north)) return false;
    let inside = false;
    for (const k of slabs[slabOf(y)]) {
      const ax = corners[2 * k];
      const ay = corners[2 * k + 1];
      const next = k + 1 === count ? 0 : k + 1;
      const bx = corners[2 * next];
      const by = corners[2 * next + 1];
      if (y === ay && y === by) {
        if (x >= Math.min(ax, bx) && x <= Math.max(ax, bx)) return true;
      } else if (y >= Math.min(ay, by) && y <= Math.max(ay, by)) {
        const turn = orient2d(ax, ay, bx, by, x, y);
        if (turn === 0) return true;
        // half-open in y, so that a ray through a corner counts it once
        if (ay > y !== by > y && turn > 0 === by > ay) inside = !inside;
      }
    }
    return inside;
  };
};
