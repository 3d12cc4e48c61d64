/**
 * Prediction of the boundary effect at points of a mesh from its boundary alone: the ray sum of h(r) (1 + k gain(r)) +
 * h(r + r'), r being the first hit of each ray, k the boundary's curvature there and r' the hit of the opposite ray, plus
 * what it misses at corners. Exact: one straight side, one corner between straight sides, the centre of a disc.
 * Approximate: everything else. Against finite elements on discs (observation at the centre and off it), strip, square
 * and rounded corners of 30 to 150 degrees, re-entrant corner and holes of 0.3 D to 2 D, m = 2 to 10, buffers 1 D and
 * 2.2 D, the largest error was 17 % of the value where it exceeded 0.1 percentage points.
 */
import { NumericalError } from '#core/errors.ts';
import type { BoundaryMesh, BoundarySegments } from './boundary-segments.ts';
import { boundarySegments } from './boundary-segments.ts';
import { spreadCurvature } from './spread-curvature.ts';
import { largestComponent, straightComponentExcess } from './component-excess.ts';
import { correlationChangeOf } from './correlation-change.ts';
import type { EffectTables } from './effect-tables.ts';
import { TABLE_STEP, effectTables, lookUp } from './effect-tables.ts';
import { RAYS, RAY_STEP, excessOfRays, rayX, rayY } from './ray-sum.ts';
import { cornersOf, excessOfCorners } from './corner-excess.ts';
import { largestOverShares } from './margin-effect.ts';
import type { CorrelationModel } from './model.ts';
import { resolveScale } from './scale.ts';

export { bufferForTolerance, cornerExcess, effectInForce, straightSideExcess } from './margin-effect.ts';

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
  const spread = spreadCurvature(segments, scaleKm);
  const corners = cornersOf(segments, mesh.crs === 'lonlat-deg');
  const frame = new Float64Array(9);
  const sweep = createSweep(mesh, segments, spread, tables, scaleKm);
  const components = model.kind === 'vector' ? componentTable(model, tables) : null;
  const variance = new Float64Array(count);
  const correlation = new Float64Array(count);
  for (let i = 0; i < count; i++) {
    if (!sweep.cast(at[2 * i], at[2 * i + 1])) continue;
    writeFrame(at[2 * i], at[2 * i + 1], mesh.crs === 'lonlat-deg' ? mesh.radiusKm : 0, frame);
    const excess = Math.max(0, excessOfRays(tables, sweep.distance, sweep.curvature, scaleKm) + excessOfCorners(corners, tables, frame, scaleKm));
    correlation[i] = correlationChangeOf(model.steps, excess);
    variance[i] = components ? lookUp(components, straightDistance(tables.image, excess)) : excess;
  }
  return { variance, correlation };
}

/** Larger magnitude of the components' changes for a straight side at distance i TABLE_STEP. */
function componentTable(model: CorrelationModel, tables: EffectTables): Float64Array {
  return Float64Array.from(tables.image, (_, i) =>
    largestOverShares(model, (share) => largestComponent(straightComponentExcess(model.steps, i * TABLE_STEP, share))),
  );
}

/** Distance in scales of the straight side whose excess c(2d) is the given one; 0 from 1 on. */
function straightDistance(image: Float64Array, excess: number): number {
  let low = 0;
  let high = image.length - 1;
  if (excess >= 1) return 0;
  if (excess <= image[high]) return high * TABLE_STEP;
  while (high - low > 1) {
    const middle = (low + high) >> 1;
    if (image[middle] > excess) low = middle;
    else high = middle;
  }
  return (low + (image[low] - excess) / (image[low] - image[high])) * TABLE_STEP;
}

/** Casts all rays of one point: `distance` (km, Infinity: nothing within reach) and `curvature` (1/km) of each first hit. */
function createSweep(mesh: BoundaryMesh, segments: BoundarySegments, spread: Float64Array, tables: EffectTables, scaleKm: number) {
  const distance = new Float64Array(RAYS);
  const curvature = new Float64Array(RAYS);
  const { positions, groupStart, groupBall } = segments;
  const groups = groupStart.length - 1;
  const gap = new Float64Array(groups);
  const isSphere = mesh.crs === 'lonlat-deg';
  const radius = mesh.radiusKm;
  const reachKm = tables.reach * scaleKm;
  const frame = new Float64Array(9);

  return { distance, curvature, cast };

  /** False when no boundary is within reach. */
  function cast(x: number, y: number): boolean {
    writeFrame(x, y, isSphere ? radius : 0, frame);
    let nearest = Infinity;
    let nearestGroup = 0;
    for (let g = 0; g < groups; g++) {
      const bx = groupBall[4 * g] - frame[6], by = groupBall[4 * g + 1] - frame[7], bz = groupBall[4 * g + 2] - frame[8];
      gap[g] = Math.sqrt(bx * bx + by * by + bz * bz) - groupBall[4 * g + 3];
      if (gap[g] < nearest) {
        nearest = gap[g];
        nearestGroup = g;
      }
    }
    if (nearest > reachKm) return false;
    distance.fill(Infinity);
    const closest = castGroup(nearestGroup);
    const farthest = Math.min(reachKm, lookUp(tables.relativeReach, closest / scaleKm) * scaleKm || reachKm);
    for (let g = 0; g < groups; g++) if (g !== nearestGroup && gap[g] <= farthest) castGroup(g);
    return true;
  }

  /** Casts the rays that meet the edges of one group; returns the distance of its closest vertex, km. */
  function castGroup(g: number): number {
    const [ex, ey, ez, nx, ny, nz, px, py, pz] = frame;
    let closest = Infinity;
    let x1 = 0, y1 = 0, angle1 = 0;
    // a group of n edges holds n + 1 vertices
    for (let e = groupStart[g], q = 3 * (e + g), isFirst = true; e <= groupStart[g + 1]; e++, q += 3) {
      const dx = positions[q] - px, dy = positions[q + 1] - py, dz = positions[q + 2] - pz;
      let x2 = dx, y2 = dy;
      const square = dx * dx + dy * dy + dz * dz;
      if (isSphere) {
        // azimuthal equidistant: great-circle distance instead of the tangential one
        const stretch = arcOverTangent(square / (4 * radius * radius));
        x2 = (dx * ex + dy * ey + dz * ez) * stretch;
        y2 = (dx * nx + dy * ny + dz * nz) * stretch;
      }
      if (square < closest) closest = square;
      const angle2 = rayIndex(x2, y2);
      const cross = x1 * y2 - y1 * x2;
      // the domain lies to the left: only edges seen from inside are lit
      if (!isFirst && cross > 0) {
        const sx = x2 - x1, sy = y2 - y1;
        const to = angle2 < angle1 ? angle2 + RAYS : angle2;
        for (let k = Math.ceil(angle1); k <= to; k++) {
          const ray = k >= RAYS ? k - RAYS : k;
          const r = cross / (rayX[ray] * sy - rayY[ray] * sx);
          if (r > 0 && r < distance[ray]) {
            distance[ray] = r;
            curvature[ray] = spread[e - 1];
          }
        }
      }
      isFirst = false;
      x1 = x2;
      y1 = y2;
      angle1 = angle2;
    }
    return Math.sqrt(closest);
  }
}

/** East, north and the position (km) of a point into `out`; in the plane (radius 0) the axes and (x, y, 0). */
function writeFrame(x: number, y: number, radius: number, out: Float64Array): void {
  if (radius === 0) {
    out.set([1, 0, 0, 0, 1, 0, x, y, 0]);
    return;
  }
  const degree = Math.PI / 180;
  const sinLon = Math.sin(x * degree), cosLon = Math.cos(x * degree);
  const sinLat = Math.sin(y * degree), cosLat = Math.cos(y * degree);
  out.set([-sinLon, cosLon, 0, -sinLat * cosLon, -sinLat * sinLon, cosLat]);
  out.set([radius * cosLat * cosLon, radius * cosLat * sinLon, radius * sinLat], 6);
}

/**
 * Direction of (x, y) in ray steps, 0 <= index < RAYS: the arc tangent to 1e-5 by the polynomial 4.4.49 of Abramowitz &
 * Stegun. It only decides which of two neighbouring edges a ray is given to; the hit itself is exact.
 */
function rayIndex(x: number, y: number): number {
  const ax = Math.abs(x), ay = Math.abs(y);
  const t = ax > ay ? ay / ax : ax / ay;
  const t2 = t * t;
  let angle = t * (0.9998660 + t2 * (-0.3302995 + t2 * (0.1801410 + t2 * (-0.0851330 + t2 * 0.0208351))));
  if (ay >= ax) angle = Math.PI / 2 - angle;
  if (x < 0) angle = Math.PI - angle;
  if (y < 0) angle = 2 * Math.PI - angle;
  return angle / RAY_STEP;
}

/** asin(t) / (t sqrt(1 - t²)) for t² = `q`: arc over tangential distance, t half the chord in radii. */
const arcOverTangent = (q: number): number => (q < 0.01 ? 1 + q * (2 / 3 + q * (8 / 15 + (q * 16) / 35)) : Math.asin(Math.min(1, Math.sqrt(q))) / Math.sqrt(Math.max(1e-12, q * (1 - q))));
