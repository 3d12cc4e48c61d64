import { NumericalError } from '#core/errors.ts';
import { sin } from '#core/geometry/deterministic-math.ts';
import type { CoordinateReference } from '#core/geometry/mesh.ts';
import { writeLonLat, writeUnitVector } from '#core/geometry/sphere.ts';

import { createPointGrid } from './point-grid.ts';
import type { PointGrid } from './point-grid.ts';

/** What the near-observation rule needs to know of the candidate rows; arrays have one entry per candidate. */
export interface Candidates {
  crs: CoordinateReference;
  sphereRadiusKm: number;
  x: Float64Array;
  y: Float64Array;
  /** NaN where not given. */
  errorSd?: Float64Array;
}

/** Candidates that became one place: members ascending, groups ordered by their first member. */
export interface Groups {
  /** `members[start[g]] .. members[start[g + 1] - 1]` are group g. */
  start: Uint32Array;
  members: Uint32Array;
  x: Float64Array;
  y: Float64Array;
}

/** Below a micrometre only coincident positions are near. */
const SMALLEST_KM = 1e-9;

/** 3 coordinates per candidate and a reach in a space where plain distance decides. */
interface SearchSpace {
  points: Float64Array;
  reach: number;
  isFlat: boolean;
  /** Moves candidate i to a position in the candidates' own coordinates. */
  place(i: number, x: number, y: number): void;
}

/**
 * The plane in km, or unit vectors and the chord of the great-circle distance. For coincidence the coordinates
 * themselves, a pole having longitude 0.
 */
const createSearchSpace = ({ crs, sphereRadiusKm, x, y }: Candidates, km: number): SearchSpace => {
  const points = new Float64Array(3 * x.length);
  const isCoincidence = km < SMALLEST_KM;
  const isFlat = crs === 'plane-km' || isCoincidence;
  const place = (i: number, px: number, py: number): void => {
    if (!isFlat) {
      writeUnitVector(px, py, points, 3 * i);
      return;
    }
    const isPole = crs === 'lonlat-deg' && (py === 90 || py === -90);
    // adding 0 turns -0 into 0, so that equal coordinates have equal bits
    points[3 * i] = isPole ? 0 : px + 0;
    points[3 * i + 1] = py + 0;
  };
  for (let i = 0; i < x.length; i++) place(i, x[i], y[i]);
  const angle = km / sphereRadiusKm;
  // no chord exceeds 2
  const chord = angle >= Math.PI ? 3 : 2 * sin(angle / 2);
  return { points, reach: isCoincidence ? 0 : isFlat ? km : chord, isFlat, place };
};

/** Indices from the smallest error standard deviation to the largest (those without one last), then by index. */
const orderByPrecision = (errorSd: Float64Array | undefined, indices: Uint32Array): Uint32Array => {
  if (!errorSd) return indices.slice().sort();
  const sd = new Float64Array(indices.length);
  for (let k = 0; k < sd.length; k++) sd[k] = Number.isNaN(errorSd[indices[k]]) ? Infinity : errorSd[indices[k]];
  const order = sortedOrder(sd, indices);
  for (let k = 0; k < order.length; k++) order[k] = indices[order[k]];
  return order;
};

/** Positions in `keys` (not negative) from the least to the greatest, equal ones by `ties`. */
const sortedOrder = (keys: Float64Array, ties: Uint32Array): Uint32Array => {
  // the bits of doubles that are not negative sort like the doubles: radix sort, least significant digit first
  const words = new Uint32Array(keys.buffer, keys.byteOffset, 2 * keys.length);
  const low = isLittleEndian ? 0 : 1;
  let from: Uint32Array = allIndices(keys.length);
  let to: Uint32Array = new Uint32Array(keys.length);
  const start = new Uint32Array(0x10001);
  const sortBy = (source: Uint32Array, stride: number, offset: number, shift: number): void => {
    start.fill(0);
    for (let k = 0; k < from.length; k++) start[((source[stride * k + offset] >>> shift) & 0xffff) + 1]++;
    for (let d = 0; d < 0x10000; d++) start[d + 1] += start[d];
    for (let k = 0; k < from.length; k++) to[start[(source[stride * from[k] + offset] >>> shift) & 0xffff]++] = from[k];
    [from, to] = [to, from];
  };
  for (const shift of [0, 16]) sortBy(ties, 1, 0, shift);
  for (const offset of [low, 1 - low]) for (const shift of [0, 16]) sortBy(words, 2, offset, shift);
  return from;
};

const isLittleEndian = new Uint8Array(new Uint16Array([1]).buffer)[0] === 1;

/**
 * Greedy centres: in the given order a candidate is a centre when no centre lies closer than the reach. Returns for
 * each candidate of the order itself if it is a centre, else its nearest centre (of equally near ones the lowest
 * index); -1 for the rest.
 */
const findCentres = ({ points, reach, isFlat }: SearchSpace, order: Uint32Array): Int32Array => {
  const grid = createPointGrid(points, reach, order.length, isFlat);
  const centreOf = new Int32Array(points.length / 3).fill(-1);
  let centres = 0;
  for (const i of order) {
    if (grid.hasNear(i)) continue;
    grid.insert(i);
    centreOf[i] = i;
    centres++;
  }
  if (centres === order.length) return centreOf;
  for (const i of order) if (centreOf[i] < 0) centreOf[i] = grid.nearest(i);
  return centreOf;
};

const allIndices = (count: number): Uint32Array => {
  const indices = new Uint32Array(count);
  for (let i = 0; i < count; i++) indices[i] = i;
  return indices;
};

/**
 * Marks the candidates to keep when near ones are thinned: from the smallest error standard deviation to the largest,
 * then by row, a candidate is kept unless a kept one lies closer than km. Kept ones are therefore at least km apart,
 * and every dropped one has a kept one, no less precise, closer than km.
 */
export const thinNear = (candidates: Candidates, km: number): Uint8Array => {
  const order = orderByPrecision(candidates.errorSd, allIndices(candidates.x.length));
  const centreOf = findCentres(createSearchSpace(candidates, km), order);
  const kept = new Uint8Array(centreOf.length);
  for (let i = 0; i < kept.length; i++) kept[i] = centreOf[i] === i ? 1 : 0;
  return kept;
};

/**
 * Groups of candidates to combine. Each round takes centres as `thinNear` keeps candidates, joins every other one to
 * its nearest centre and puts the group at its members' weighted mean position; rounds repeat on the groups until
 * all are at least km apart. Weights are inverse error variances, or equal where a member has no standard deviation,
 * so that on a locally linear field the combined value belongs to the combined position.
 */
export const combineNear = (candidates: Candidates, km: number): Groups => {
  const count = candidates.x.length;
  const space = createSearchSpace(candidates, km);
  // a group goes by its first member, at whose place its position and standard deviation are kept
  const x = candidates.x.slice();
  const y = candidates.y.slice();
  const errorSd = candidates.errorSd?.slice();
  const groupOf = allIndices(count);
  const membersOf = new Map<number, Uint32Array>();

  /** Makes one group of some; returns its number. */
  const merge = (groups: number[]): number => {
    const members = Uint32Array.from(groups.flatMap((group) => [...(membersOf.get(group) ?? [group])])).sort();
    for (const group of groups) membersOf.delete(group);
    const [first] = members;
    for (const i of members) groupOf[i] = first;
    membersOf.set(first, members);
    const [px, py] = meanPosition(candidates, members);
    x[first] = px;
    y[first] = py;
    space.place(first, px, py);
    if (errorSd && candidates.errorSd) errorSd[first] = combinedErrorSd(members, candidates.errorSd);
    return first;
  };

  let grid: PointGrid | null = null;
  let round: Uint32Array = groupOf.slice();
  while (round.length > 0) {
    const merges = mergesOf(findCentres(space, orderByPrecision(errorSd, round)), round);
    for (const groups of merges) for (const group of groups) grid?.remove(group);
    const merged = merges.map(merge);
    const standing: PointGrid = grid ?? createPointGrid(space.points, space.reach, count, space.isFlat);
    if (grid) for (const group of merged) grid.insert(group);
    else for (let i = 0; i < count; i++) if (groupOf[i] === i) standing.insert(i);
    grid = standing;

    // groups that did not move are at least km apart: the next round is about the moved ones and their neighbours
    const next = new Set<number>();
    for (const group of merged) {
      const near = standing.listNear(group);
      if (near.length > 0) next.add(group);
      for (const other of near) next.add(other);
    }
    round = Uint32Array.from(next);
  }
  return collectGroups(groupOf, x, y);
};

/** Lists of groups that become one, the centre first. */
const mergesOf = (centreOf: Int32Array, round: Uint32Array): number[][] => {
  const lists = new Map<number, number[]>();
  for (const i of round) {
    const centre = centreOf[i];
    if (centre === i) continue;
    const list = lists.get(centre);
    if (list) list.push(i);
    else lists.set(centre, [centre, i]);
  }
  return [...lists.values()];
};

const collectGroups = (groupOf: Uint32Array, x: Float64Array, y: Float64Array): Groups => {
  const count = groupOf.length;
  const numberOf = new Uint32Array(count);
  const sizes = new Uint32Array(count + 1);
  let groups = 0;
  // a group's first member comes before its others
  for (let i = 0; i < count; i++) {
    if (groupOf[i] === i) numberOf[i] = groups++;
    sizes[numberOf[groupOf[i]] + 1]++;
  }
  const start = sizes.slice(0, groups + 1);
  for (let g = 0; g < groups; g++) start[g + 1] += start[g];
  const fill = start.slice();
  const members = new Uint32Array(count);
  for (let i = 0; i < count; i++) members[fill[numberOf[groupOf[i]]]++] = i;
  const gx = new Float64Array(groups);
  const gy = new Float64Array(groups);
  for (let g = 0; g < groups; g++) {
    gx[g] = x[members[start[g]]];
    gy[g] = y[members[start[g]]];
  }
  return { start, members, x: gx, y: gy };
};

/**
 * Weights of a group's members for its means: (smallest sd / sd)², 1 for the most precise one; all 1 where a member
 * has no standard deviation. Inverse-variance weights up to a factor that keeps them from overflowing.
 */
export const memberWeights = (members: Uint32Array, errorSd: Float64Array | undefined): Float64Array => {
  const weights = new Float64Array(members.length).fill(1);
  if (!errorSd) return weights;
  let smallest = Infinity;
  for (const i of members) {
    if (Number.isNaN(errorSd[i])) return weights;
    smallest = Math.min(smallest, errorSd[i]);
  }
  for (const [k, i] of members.entries()) {
    const ratio = smallest / errorSd[i];
    weights[k] = ratio * ratio;
  }
  return weights;
};

/** Standard deviation 1/sqrt(sum of 1/sd²) of the members' inverse-variance mean; NaN where a member has none. */
export const combinedErrorSd = (members: Uint32Array, errorSd: Float64Array): number => {
  let smallest = Infinity;
  for (const i of members) {
    if (Number.isNaN(errorSd[i])) return NaN;
    smallest = Math.min(smallest, errorSd[i]);
  }
  let sum = 0;
  for (const i of members) {
    const ratio = smallest / errorSd[i];
    sum += ratio * ratio;
  }
  return smallest / Math.sqrt(sum);
};

/** Weighted mean position: in the plane of the coordinates, on the sphere the direction of the mean unit vector. */
const meanPosition = (candidates: Candidates, members: Uint32Array): [number, number] => {
  const { crs, x, y, errorSd } = candidates;
  const weights = memberWeights(members, errorSd);
  const lead = members[weights.indexOf(1)];
  const isPole = crs === 'lonlat-deg' && Math.abs(y[lead]) === 90;
  if (members.every((i) => y[i] === y[lead] && (isPole || x[i] === x[lead]))) return [x[lead], y[lead]];
  if (crs === 'lonlat-deg') return meanOnSphere(candidates, members, weights) ?? [x[lead], y[lead]];
  let dx = 0;
  let dy = 0;
  let sum = 0;
  for (const [k, i] of members.entries()) {
    dx += weights[k] * (x[i] - x[lead]);
    dy += weights[k] * (y[i] - y[lead]);
    sum += weights[k];
  }
  return [x[lead] + dx / sum, y[lead] + dy / sum];
};

/** Below this length a mean of unit vectors has no direction worth the name: its points are spread round the sphere. */
const SHORTEST_MEAN_VECTOR = 1e-6;

/** Direction of the weighted mean of the unit vectors; null where there is none. */
const meanOnSphere = ({ x, y }: Candidates, members: Uint32Array, weights: Float64Array): [number, number] | null => {
  const v = new Float64Array(3);
  let sx = 0;
  let sy = 0;
  let sz = 0;
  let sum = 0;
  for (const [k, i] of members.entries()) {
    writeUnitVector(x[i], y[i], v, 0);
    sx += weights[k] * v[0];
    sy += weights[k] * v[1];
    sz += weights[k] * v[2];
    sum += weights[k];
  }
  if (Math.sqrt(sx * sx + sy * sy + sz * sz) < SHORTEST_MEAN_VECTOR * sum) return null;
  writeLonLat(sx, sy, sz, v, 0);
  return [v[0], v[1]];
};

const MOST_PAIRS_NAMED = 20;

/**
 * Throws when a candidate lies closer than km to another one.
 * @throws NumericalError POINTS_TOO_CLOSE with up to 20 pairs of lines; `details.count` candidates have a nearer one.
 */
export const refuseNear = (candidates: Candidates, km: number, lineOf: (i: number) => number): void => {
  const order = allIndices(candidates.x.length);
  const centreOf = findCentres(createSearchSpace(candidates, km), order);
  const count = centreOf.reduce((sum, centre, i) => sum + (centre === i ? 0 : 1), 0);
  if (count === 0) return;
  const pairs: [number, number][] = [];
  for (let i = 0; i < order.length && pairs.length < MOST_PAIRS_NAMED; i++)
    if (centreOf[i] !== i) pairs.push([lineOf(centreOf[i]), lineOf(i)]);
  const named = pairs.slice(0, 5).map(([a, b]) => `${a} and ${b}`);
  const rest = count > named.length ? `, and ${count - named.length} more` : '';
  const what = km > 0 ? `closer than ${km} km to another one` : 'at the same place as another one';
  throw new NumericalError(
    'POINTS_TOO_CLOSE',
    `${count} ${count === 1 ? 'observation lies' : 'observations lie'} ${what}: lines ${named.join(', ')}${rest}. ` +
      `Combine or thin near observations, ${km > 0 ? 'give a smaller distance, ' : ''}or correct those lines in the file.`,
    { details: { km, count, pairs } },
  );
};
