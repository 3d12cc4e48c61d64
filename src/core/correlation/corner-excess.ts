/**
 * What the ray sum misses at a corner between two straight stretches of the boundary: the exact excess of the infinite
 * wedge less the ray sum of that wedge, so that an isolated corner of any interior angle is exact.
 */
import type { BoundarySegments } from './boundary-segments.ts';
import type { EffectTables } from './effect-tables.ts';
import { lookUp } from './effect-tables.ts';
import { RAYS, excessOfRays, rayX, rayY } from './ray-sum.ts';
import { wedgeExcess } from './wedge.ts';

/** Corners that turn less are left to the ray sum, radians. */
const LEAST_TURNING = (2 * Math.PI) / 180;
const ANGLE_STEP = (5 * Math.PI) / 180;
const SHARPEST = 3;
const BLUNTEST = 69;
const RHO_STEP = 0.2;
const PHI_NODES = 17;

/** 9 numbers per corner: vertex (km), the direction in which its leaving side runs and the normal to its left (unit vectors, 3 each). */
export interface BoundaryCorners {
  places: Float64Array;
  /** Interior angle of each corner, radians. */
  interior: Float64Array;
}

/** Corners of the boundary: vertices between two edges without curvature. */
export function cornersOf(segments: BoundarySegments, isSphere: boolean): BoundaryCorners {
  const places: number[] = [];
  const interior: number[] = [];
  for (const { vertex, before, after, isStraight } of vertexTriples(segments)) {
    if (!isStraight) continue;
    const up = isSphere ? unit(vertex) : [0, 0, 1];
    const arriving = unit(vertex.map((v, k) => v - before[k]));
    const leaving = unit(after.map((v, k) => v - vertex[k]));
    const turning = Math.atan2(dot(cross(arriving, leaving), up), dot(arriving, leaving));
    if (Math.abs(turning) < LEAST_TURNING) continue;
    places.push(...vertex, ...leaving, ...cross(up, leaving));
    interior.push(Math.PI - turning);
  }
  return { places: Float64Array.from(places), interior: Float64Array.from(interior) };
}

function* vertexTriples(s: BoundarySegments) {
  const point = (q: number) => [s.positions[3 * q], s.positions[3 * q + 1], s.positions[3 * q + 2]];
  for (const [first, last] of s.loopGroups) {
    const starts: number[] = [];
    const edges: number[] = [];
    for (let g = first; g < last; g++)
      for (let e = s.groupStart[g]; e < s.groupStart[g + 1]; e++) {
        starts.push(e + g);
        edges.push(e);
      }
    const n = starts.length;
    for (let k = 0; k < n; k++)
      yield {
        before: point(starts[(k + n - 1) % n]),
        vertex: point(starts[k]),
        after: point(starts[(k + 1) % n]),
        isStraight: s.curvature[edges[(k + n - 1) % n]] === 0 && s.curvature[edges[k]] === 0,
      };
  }
}

/** The sum over the corners within reach of the point whose `frame` holds east, north and position (km). */
export function excessOfCorners(corners: BoundaryCorners, tables: EffectTables, frame: Float64Array, scaleKm: number): number {
  let sum = 0;
  for (let k = 0; k < corners.interior.length; k++) {
    const q = 9 * k;
    const p = corners.places;
    const dx = frame[6] - p[q], dy = frame[7] - p[q + 1], dz = frame[8] - p[q + 2];
    const rho = Math.sqrt(dx * dx + dy * dy + dz * dz) / scaleKm;
    if (rho >= tables.reach) continue;
    const along = dx * p[q + 3] + dy * p[q + 4] + dz * p[q + 5];
    const left = dx * p[q + 6] + dy * p[q + 7] + dz * p[q + 8];
    let phi = Math.atan2(left, along);
    if (phi < 0) phi += 2 * Math.PI;
    if (phi < corners.interior[k]) sum += missingExcess(tables, corners.interior[k], rho, phi);
  }
  return sum;
}

const cache = new Map<string, Float64Array>();

function missingExcess(tables: EffectTables, alpha: number, rho: number, phi: number): number {
  const at = Math.min(BLUNTEST, Math.max(SHARPEST, alpha / ANGLE_STEP));
  const low = Math.min(BLUNTEST - 1, Math.floor(at));
  const share = at - low;
  // symmetric about the bisector
  const across = Math.min(phi, alpha - phi) / (alpha / 2);
  return (1 - share) * interpolate(cornerTable(tables, low), rho, across) + share * interpolate(cornerTable(tables, low + 1), rho, across);
}

function interpolate(table: Float64Array, rho: number, across: number): number {
  const i = Math.floor(rho / RHO_STEP);
  const j = Math.min(PHI_NODES - 2, Math.floor(across * (PHI_NODES - 1)));
  const t = rho / RHO_STEP - i;
  const u = across * (PHI_NODES - 1) - j;
  const q = i * PHI_NODES + j;
  if (q + PHI_NODES + 1 >= table.length) return 0;
  return (1 - t) * ((1 - u) * table[q] + u * table[q + 1]) + t * ((1 - u) * table[q + PHI_NODES] + u * table[q + PHI_NODES + 1]);
}

/** Rows of growing rho, PHI_NODES angles from the side to the bisector in each. */
function cornerTable(tables: EffectTables, angleIndex: number): Float64Array {
  const key = `${tables.steps}/${angleIndex}`;
  const known = cache.get(key);
  if (known) return known;
  const alpha = angleIndex * ANGLE_STEP;
  const rows = Math.ceil(tables.reach / RHO_STEP) + 1;
  const table = new Float64Array(rows * PHI_NODES);
  const image = (x: number) => lookUp(tables.image, x);
  const straight = new Float64Array(RAYS);
  const distance = new Float64Array(RAYS);
  if (angleIndex * 5 !== 180)
    for (let i = 0; i < rows; i++)
      for (let j = 0; j < PHI_NODES; j++) {
        // on the side itself the rays along it are ambiguous
        const phi = (alpha / 2) * Math.max(0.01, j / (PHI_NODES - 1));
        const rho = Math.max(0.02, i * RHO_STEP);
        castWedge(alpha, rho, phi, distance);
        table[i * PHI_NODES + j] = wedgeExcess(image, alpha, rho, phi) - excessOfRays(tables, distance, straight, 1);
      }
  cache.set(key, table);
  return table;
}

/** Distances along all rays from (rho, phi) to the sides at angles 0 and alpha, vertex at the origin. */
function castWedge(alpha: number, rho: number, phi: number, out: Float64Array): void {
  const x = rho * Math.cos(phi);
  const y = rho * Math.sin(phi);
  const sx = Math.cos(alpha);
  const sy = Math.sin(alpha);
  for (let k = 0; k < RAYS; k++) {
    let least = Infinity;
    const first = -y / rayY[k];
    if (rayY[k] < 0 && x + first * rayX[k] > 0) least = first;
    const facing = rayX[k] * sy - rayY[k] * sx;
    const second = (y * sx - x * sy) / facing;
    // seen from inside, and on the side's half of its line
    if (facing < 0 && second > 0 && (x + second * rayX[k]) * sx + (y + second * rayY[k]) * sy > 0) least = Math.min(least, second);
    out[k] = least;
  }
}

const dot = (a: number[], b: number[]): number => a[0] * b[0] + a[1] * b[1] + a[2] * b[2];
const cross = (a: number[], b: number[]): number[] => [a[1] * b[2] - a[2] * b[1], a[2] * b[0] - a[0] * b[2], a[0] * b[1] - a[1] * b[0]];
const unit = (a: number[]): number[] => a.map((v) => v / Math.sqrt(dot(a, a)));
