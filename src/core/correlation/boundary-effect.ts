/**
 * Prediction of the boundary effect at points of a mesh from its boundary alone, by rays: the excess of the variance is
 * the integral over all directions of h(r) (1 + k gain(r)) + h(r + r'), r being the first hit of the ray, k the
 * boundary's curvature there (times l) and r' the hit of the opposite ray. Exact for one straight side (images), for two
 * parallel ones up to the third reflection and at the centre of a disc; elsewhere an approximation.
 */
import { NumericalError } from '#core/errors.ts';
import type { BoundaryMesh, BoundarySegments } from './boundary-segments.ts';
import { boundarySegments } from './boundary-segments.ts';
import { largestComponent, straightComponentExcess } from './component-excess.ts';
import { correlationChangeOf } from './correlation-change.ts';
import type { EffectTables } from './effect-tables.ts';
import { effectTables, lookUp } from './effect-tables.ts';
import { largestOverShares } from './margin-effect.ts';
import { maternCorrelation } from './matern.ts';
import type { CorrelationModel } from './model.ts';
import { resolveScale } from './scale.ts';

export { bufferForTolerance, cornerExcess, effectInForce, straightSideExcess } from './margin-effect.ts';

/** Rays per point: the ray sum of a straight side is exact to 1e-6 of its value. */
const RAYS = 96;
const RAY_STEP = (2 * Math.PI) / RAYS;
const rayX = Float64Array.from({ length: RAYS }, (_, k) => Math.cos(k * RAY_STEP));
const rayY = Float64Array.from({ length: RAYS }, (_, k) => Math.sin(k * RAY_STEP));

/** One value per point: relative change of the variance, largest absolute change of a correlation. */
export interface BoundaryEffect {
  variance: Float64Array;
  correlation: Float64Array;
}

/**
 * Predicted boundary effect at points in the domain, `at` holding 2 coordinates per point in the mesh's own reference.
 * A two-component model's variance is the larger magnitude over its components, taken from the straight side that has
 * the same scalar effect.
 */
export function predictBoundaryEffect(mesh: BoundaryMesh, at: Float64Array, model: CorrelationModel): BoundaryEffect {
  const count = at.length / 2;
  for (let i = 0; i < at.length; i++)
    if (!Number.isFinite(at[i])) throw new NumericalError('INPUT_NOT_FINITE', `Coordinate ${i % 2} of point ${Math.floor(i / 2)} is not a finite number.`, { details: { point: Math.floor(i / 2) } });
  const { scaleKm } = resolveScale(model);
  const tables = effectTables(model.steps);
  const segments = boundarySegments(mesh);
  const sweep = createSweep(mesh, segments, tables.reach * scaleKm);
  const variance = new Float64Array(count);
  const correlation = new Float64Array(count);
  for (let i = 0; i < count; i++) {
    if (!sweep.cast(at[2 * i], at[2 * i + 1])) continue;
    const excess = excessOfRays(tables, sweep.distance, sweep.curvature, scaleKm);
    correlation[i] = correlationChangeOf(model.steps, excess);
    variance[i] = model.kind === 'vector' ? vectorVariance(model, excess) : excess;
  }
  return { variance, correlation };
}

function excessOfRays(tables: EffectTables, distance: Float64Array, curvature: Float64Array, scaleKm: number): number {
  let sum = 0;
  for (let k = 0; k < RAYS; k++) {
    const r = distance[k] / scaleKm;
    if (r >= tables.reach) continue;
    const bend = curvature[k] * scaleKm * lookUp(tables.gain, r);
    // a hole scatters: its curvature weakens the effect, never below zero
    sum += lookUp(tables.rayDensity, r) * (bend >= 0 ? 1 + bend : 1 / (1 - bend));
    const both = r + distance[(k + RAYS / 2) % RAYS] / scaleKm;
    if (both < tables.reach) sum += lookUp(tables.rayDensity, both);
  }
  return sum * RAY_STEP;
}

function vectorVariance(model: CorrelationModel, excess: number): number {
  const d = straightDistance(model.steps, excess);
  return largestOverShares(model, (share) => largestComponent(straightComponentExcess(model.steps, d, share)));
}

/** Distance in scales of the straight side whose excess c(2d) is the given one; 0 from 1 on. */
function straightDistance(m: number, excess: number): number {
  let low = 0;
  let high = 40 + 4 * m;
  for (let k = 0; k < 40; k++) {
    const middle = (low + high) / 2;
    if (maternCorrelation(m, 2 * middle) > excess) low = middle;
    else high = middle;
  }
  return (low + high) / 2;
}

/** Casts all rays of one point: `distance` (km, Infinity: nothing within reach) and `curvature` (1/km) of each first hit. */
function createSweep(mesh: BoundaryMesh, segments: BoundarySegments, reachKm: number) {
  const distance = new Float64Array(RAYS);
  const curvature = new Float64Array(RAYS);
  const { ends, groupStart, groupBall } = segments;
  const degree = Math.PI / 180;
  const isSphere = mesh.crs === 'lonlat-deg';
  const radius = mesh.radiusKm;

  return { distance, curvature, cast };

  /** False when no boundary is within reach. */
  function cast(cx: number, cy: number): boolean {
    // frame at the point: east, north, and the point itself
    let ex = 1, ey = 0, ez = 0, nx = 0, ny = 1, nz = 0, px = cx, py = cy, pz = 0;
    if (isSphere) {
      const sinLon = Math.sin(cx * degree), cosLon = Math.cos(cx * degree);
      const sinLat = Math.sin(cy * degree), cosLat = Math.cos(cy * degree);
      ex = -sinLon; ey = cosLon; ez = 0;
      nx = -sinLat * cosLon; ny = -sinLat * sinLon; nz = cosLat;
      px = radius * cosLat * cosLon; py = radius * cosLat * sinLon; pz = radius * sinLat;
    }
    let hasHit = false;
    for (let g = 0; g + 1 < groupStart.length; g++) {
      const bx = groupBall[4 * g] - px, by = groupBall[4 * g + 1] - py, bz = groupBall[4 * g + 2] - pz;
      const far = reachKm + groupBall[4 * g + 3];
      if (bx * bx + by * by + bz * bz > far * far) continue;
      if (!hasHit) {
        distance.fill(Infinity);
        hasHit = true;
      }
      for (let e = groupStart[g]; e < groupStart[g + 1]; e++) {
        const q = 6 * e;
        const ax = ends[q] - px, ay = ends[q + 1] - py, az = ends[q + 2] - pz;
        const dx = ends[q + 3] - px, dy = ends[q + 4] - py, dz = ends[q + 5] - pz;
        let x1 = ax * ex + ay * ey + az * ez, y1 = ax * nx + ay * ny + az * nz;
        let x2 = dx * ex + dy * ey + dz * ez, y2 = dx * nx + dy * ny + dz * nz;
        if (isSphere) {
          // azimuthal equidistant: great-circle distance instead of the tangential one
          const f1 = arcOverTangent((ax * ax + ay * ay + az * az) / (4 * radius * radius));
          const f2 = arcOverTangent((dx * dx + dy * dy + dz * dz) / (4 * radius * radius));
          x1 *= f1; y1 *= f1; x2 *= f2; y2 *= f2;
        }
        const cross = x1 * y2 - y1 * x2;
        // the domain lies to the left: only edges seen from inside are lit
        if (cross <= 0) continue;
        const sx = x2 - x1, sy = y2 - y1;
        const from = Math.atan2(y1, x1) / RAY_STEP;
        let to = Math.atan2(y2, x2) / RAY_STEP;
        if (to < from) to += RAYS;
        for (let k = Math.ceil(from); k <= to; k++) {
          const ray = k < 0 ? k + RAYS : k >= RAYS ? k - RAYS : k;
          const r = cross / (rayX[ray] * sy - rayY[ray] * sx);
          if (r > 0 && r < distance[ray]) {
            distance[ray] = r;
            curvature[ray] = segments.curvature[e];
          }
        }
      }
    }
    return hasHit;
  }
}

/** asin(t) / (t sqrt(1 - t²)) for t² = `q`: arc over tangential distance, t half the chord in radii. */
const arcOverTangent = (q: number): number => (q < 0.01 ? 1 + q * (2 / 3 + q * (8 / 15 + (q * 16) / 35)) : Math.asin(Math.min(1, Math.sqrt(q))) / Math.sqrt(Math.max(1e-12, q * (1 - q))));
