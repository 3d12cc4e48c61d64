import { NumericalError } from '#core/errors.ts';
import { sin } from '#core/geometry/deterministic-math.ts';
import type { CoordinateReference } from '#core/geometry/mesh.ts';

import { createPointGrid } from './point-grid.ts';
import { lonLatOfVector, writeUnitVector } from './unit-vector.ts';

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

/**
 * Points and reach in a space where plain distance decides: the plane in km, or unit vectors and the chord of the
 * great-circle distance. With km = 0 the coordinates themselves, a pole having longitude 0.
 */
const createSearchSpace = (candidates: Candidates, km: number): { points: Float64Array; dimensions: 2 | 3; reach: number } => {
  const { crs, sphereRadiusKm, x, y } = candidates;
  const count = x.length;
  if (crs === 'plane-km' || km === 0) {
    const points = new Float64Array(2 * count);
    for (let i = 0; i < count; i++) {
      const isPole = crs === 'lonlat-deg' && (y[i] === 90 || y[i] === -90);
      // adding 0 turns -0 into 0, so that equal coordinates have equal bits
      points[2 * i] = isPole ? 0 : x[i] + 0;
      points[2 * i + 1] = y[i] + 0;
    }
    return { points, dimensions: 2, reach: km };
  }
  const points = new Float64Array(3 * count);
  for (let i = 0; i < count; i++) writeUnitVector(x[i], y[i], points, 3 * i);
  const angle = km / sphereRadiusKm;
  // no chord exceeds 2
  return { points, dimensions: 3, reach: angle >= Math.PI ? 3 : 2 * sin(angle / 2) };
};

/** Indices from the smallest error standard deviation to the largest (those without one last), then by index. */
const orderByPrecision = (errorSd: Float64Array | undefined, count: number): Uint32Array => {
  const order = Uint32Array.from({ length: count }, (_, i) => i);
  if (!errorSd) return order;
  const sd = errorSd.map((s) => (Number.isNaN(s) ? Infinity : s));
  return order.sort((a, b) => (sd[a] === sd[b] ? a - b : sd[a] - sd[b]));
};

/**
 * Greedy centres: in the order of precision a candidate is a centre when no centre lies closer than km.
 * `centreOf[i]` is i itself for a centre, else its nearest centre (of equally near ones the lowest index).
 */
const findCentres = (candidates: Candidates, km: number, order: Uint32Array): { centreOf: Int32Array; centres: number } => {
  const { points, dimensions, reach } = createSearchSpace(candidates, km);
  const grid = createPointGrid(points, dimensions, reach);
  const centreOf = new Int32Array(order.length).fill(-1);
  let centres = 0;
  for (const i of order) {
    if (grid.hasNear(i)) continue;
    grid.insert(i);
    centreOf[i] = i;
    centres++;
  }
  if (centres < order.length) for (const i of order) if (centreOf[i] < 0) centreOf[i] = grid.nearest(i);
  return { centreOf, centres };
};

/**
 * Marks the candidates to keep when near ones are thinned: from the smallest error standard deviation to the largest,
 * then by row, a candidate is kept unless a kept one lies closer than km. Kept ones are therefore at least km apart,
 * and every dropped one has a kept one, no less precise, closer than km.
 */
export const thinNear = (candidates: Candidates, km: number): Uint8Array => {
  const { centreOf } = findCentres(candidates, km, orderByPrecision(candidates.errorSd, candidates.x.length));
  return Uint8Array.from(centreOf, (centre, i) => (centre === i ? 1 : 0));
};

/**
 * Groups of candidates to combine. Each round takes centres as `thinNear` keeps candidates, joins every other one to
 * its nearest centre and puts the group at its members' weighted mean position; rounds repeat on the groups until
 * all are at least km apart. Weights are inverse error variances, or equal where a member has no standard deviation,
 * so that on a locally linear field the combined value belongs to the combined position.
 */
export const combineNear = (candidates: Candidates, km: number): Groups => {
  const count = candidates.x.length;
  let groups = singletons(candidates);
  for (;;) {
    const errorSd = candidates.errorSd && groupErrorSd(groups, candidates.errorSd);
    const now: Candidates = { ...candidates, x: groups.x, y: groups.y, errorSd };
    const { centreOf, centres } = findCentres(now, km, orderByPrecision(errorSd, groups.x.length));
    if (centres === groups.x.length) return groups;
    groups = mergeGroups(candidates, groups, centreOf, count);
  }
};

const singletons = ({ x, y }: Candidates): Groups => ({
  start: Uint32Array.from({ length: x.length + 1 }, (_, i) => i),
  members: Uint32Array.from({ length: x.length }, (_, i) => i),
  x,
  y,
});

const mergeGroups = (candidates: Candidates, groups: Groups, centreOf: Int32Array, count: number): Groups => {
  const centreOfMember = new Int32Array(count);
  for (let g = 0; g < centreOf.length; g++)
    for (let k = groups.start[g]; k < groups.start[g + 1]; k++) centreOfMember[groups.members[k]] = centreOf[g];

  // number the groups by their first member
  const numberOf = new Int32Array(centreOf.length).fill(-1);
  const size = new Uint32Array(centreOf.length + 1);
  let merged = 0;
  for (let i = 0; i < count; i++) {
    const centre = centreOfMember[i];
    if (numberOf[centre] < 0) numberOf[centre] = merged++;
    size[numberOf[centre] + 1]++;
  }
  const start = size.slice(0, merged + 1);
  for (let g = 0; g < merged; g++) start[g + 1] += start[g];
  const members = new Uint32Array(count);
  const fill = start.slice();
  for (let i = 0; i < count; i++) members[fill[numberOf[centreOfMember[i]]]++] = i;

  const x = new Float64Array(merged);
  const y = new Float64Array(merged);
  const mean = new Float64Array(2);
  for (let g = 0; g < merged; g++) {
    meanPosition(candidates, members.subarray(start[g], start[g + 1]), mean);
    x[g] = mean[0];
    y[g] = mean[1];
  }
  return { start, members, x, y };
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
  for (const [k, i] of members.entries()) weights[k] = (smallest / errorSd[i]) ** 2;
  return weights;
};

/** Standard deviation 1/sqrt(sum of 1/sd²) of each group's inverse-variance mean; NaN where a member has none. */
export const groupErrorSd = ({ start, members }: Pick<Groups, 'start' | 'members'>, errorSd: Float64Array): Float64Array => {
  const out = new Float64Array(start.length - 1);
  for (let g = 0; g < out.length; g++) {
    let smallest = Infinity;
    for (let k = start[g]; k < start[g + 1]; k++) smallest = minOrNaN(smallest, errorSd[members[k]]);
    let sum = 0;
    for (let k = start[g]; k < start[g + 1]; k++) {
      const ratio = smallest / errorSd[members[k]];
      sum += ratio * ratio;
    }
    out[g] = smallest / Math.sqrt(sum);
  }
  return out;
};

const minOrNaN = (a: number, b: number): number => (Number.isNaN(a) || Number.isNaN(b) ? NaN : Math.min(a, b));

const meanPosition = (candidates: Candidates, members: Uint32Array, out: Float64Array): void => {
  const { crs, x, y, errorSd } = candidates;
  const weights = memberWeights(members, errorSd);
  const lead = members[weights.indexOf(1)];
  out[0] = x[lead];
  out[1] = y[lead];
  const isPole = crs === 'lonlat-deg' && Math.abs(y[lead]) === 90;
  if (members.every((i) => y[i] === y[lead] && (isPole || x[i] === x[lead]))) return;
  if (crs === 'lonlat-deg') {
    meanOnSphere(candidates, members, weights, out);
    return;
  }
  let dx = 0;
  let dy = 0;
  let sum = 0;
  for (const [k, i] of members.entries()) {
    dx += weights[k] * (x[i] - x[lead]);
    dy += weights[k] * (y[i] - y[lead]);
    sum += weights[k];
  }
  out[0] += dx / sum;
  out[1] += dy / sum;
};

/** Below this length a mean of unit vectors has no direction worth the name: its points are spread round the sphere. */
const SHORTEST_MEAN_VECTOR = 1e-6;

/** Direction of the weighted mean of the unit vectors; leaves `out` alone where there is none. */
const meanOnSphere = ({ x, y }: Candidates, members: Uint32Array, weights: Float64Array, out: Float64Array): void => {
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
  if (Math.sqrt(sx * sx + sy * sy + sz * sz) < SHORTEST_MEAN_VECTOR * sum) return;
  out.set(lonLatOfVector(sx, sy, sz));
};

const MOST_PAIRS_NAMED = 20;

/**
 * Throws when a candidate lies closer than km to another one.
 * @throws NumericalError POINTS_TOO_CLOSE with up to 20 pairs of lines; `details.count` candidates have a nearer one.
 */
export const refuseNear = (candidates: Candidates, km: number, lines: Uint32Array): void => {
  const order = Uint32Array.from({ length: candidates.x.length }, (_, i) => i);
  const { centreOf, centres } = findCentres(candidates, km, order);
  const count = order.length - centres;
  if (count === 0) return;
  const pairs: [number, number][] = [];
  for (let i = 0; i < order.length && pairs.length < MOST_PAIRS_NAMED; i++)
    if (centreOf[i] !== i) pairs.push([lines[centreOf[i]], lines[i]]);
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
