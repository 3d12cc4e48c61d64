import { NumericalError } from '#core/errors.ts';
import { planeDistance } from '#core/geometry/distance.ts';
import type { Mesh } from '#core/geometry/mesh.ts';
import { NODE_KIND } from '#core/geometry/mesh.ts';
import { refine } from '#core/geometry/refine.ts';
import type { Triangulation } from '#core/geometry/triangulation.ts';
import { cutToLoops, triangulate } from '#core/geometry/triangulation.ts';

import type { DesignedMesh, SelectedObservations } from './designed-mesh.ts';
import type { Domain } from './domain.ts';
import { createDomain } from './domain.ts';
import { derivedCoreSpacing, localSpacing } from './local-spacing.ts';
import type { Recipe } from './recipe.ts';

export interface BuildOptions {
  sphereRadiusKm: number;
  /** Told the phase that begins and the share of the work done. */
  onPhase?: (phase: string, fraction: number) => void;
  isCancelled?: () => boolean;
}

/** What of a design does not change while its buffer is moved; see `prepareMesh`. */
export interface PreparedObservations {
  selected: SelectedObservations;
  domain: Domain;
  localSpacingKm: Float64Array;
}

/** Most nodes of a mesh. */
export const MAX_NODES = 3_000_000;

/** Outer boundary edges are at most this share of the buffer, so that no observation lies in their diametral circles. */
const BOUNDARY_SHARE = 0.5;

/** Outline, triangulation plane and local spacing of the observations: the part of `buildMesh` that depends on neither buffer nor sizes. */
export const prepareMesh = (selected: SelectedObservations, recipe: Pick<Recipe, 'outline'>, sphereRadiusKm: number): PreparedObservations => ({
  selected,
  domain: createDomain(selected, recipe.outline, sphereRadiusKm),
  localSpacingKm: localSpacing(selected, sphereRadiusKm).spacingKm,
});

/**
 * The mesh of a recipe: every selected observation is a node (node i is observation i), the outer boundary lies
 * `bufferKm` from the outline, and filler nodes come from Delaunay refinement with a size that is the core spacing
 * inside the outline and grows with the distance from it. The same input gives the same bytes on every machine.
 * @throws NumericalError TOO_FEW_POINTS, POINTS_COLLINEAR, POINTS_TOO_CLOSE, POINTS_TOO_WIDE, RECIPE_INVALID, MESH_TOO_LARGE, CANCELLED.
 */
export const buildMesh = (selected: SelectedObservations, recipe: Recipe, options: BuildOptions): DesignedMesh => {
  options.onPhase?.('outline', 0);
  return meshPrepared(prepareMesh(selected, recipe, options.sphereRadiusKm), recipe, options);
};

/** `buildMesh` from what `prepareMesh` returned for the same observations and outline. */
export const meshPrepared = (prepared: PreparedObservations, recipe: Recipe, options: BuildOptions): DesignedMesh => {
  checkRecipe(recipe);
  const { selected, domain, localSpacingKm } = prepared;
  const count = selected.x.length;
  const coreSpacingKm = recipe.coreSpacingKm ?? derivedCoreSpacing(localSpacingKm);
  // n-th edge g times the one before it: between two edges' middles the size grows by (g-1) h over (g+1)/2 h
  const slope = (2 * (recipe.growth - 1)) / (recipe.growth + 1);
  const sizeAt = (x: number, y: number): number => coreSpacingKm + slope * domain.distanceOutside(x, y);
  const scaleAt = domain.projection ? domain.projection.scaleAt : undefined;

  options.onPhase?.('boundary', 0.1);
  const edgeKm = Math.min(coreSpacingKm + slope * recipe.bufferKm, BOUNDARY_SHARE * recipe.bufferKm);
  // the boundary is no shorter than the outline: refuse before anything is laid out
  if (domain.perimeterKm / edgeKm > MAX_NODES) throw tooLarge(domain.perimeterKm / edgeKm);
  const boundary = domain.buffer(recipe.bufferKm, edgeKm, recipe.corners);
  if (count + boundary.boundary.length / 2 > MAX_NODES) throw tooLarge(boundary.boundary.length / 2);

  options.onPhase?.('triangulation', 0.2);
  const { triangulation: t, boundaryCount } = triangulateWithin(domain, boundary.boundary, boundary.curvature);

  options.onPhase?.('refinement', 0.4);
  const vertexSize = startingSizes(t, count, sizeAt, slope, scaleAt);
  refine(t, { sizeAt, scaleAt, slope, vertexSize, inputCount: count, maxVertices: MAX_NODES, isCancelled: options.isCancelled });

  options.onPhase?.('nodes', 0.9);
  return collectMesh(t, domain, selected, { count, boundaryCount, coreSpacingKm, localSpacingKm, radiusKm: options.sphereRadiusKm });
};

const checkRecipe = ({ bufferKm, growth, coreSpacingKm }: Recipe): void => {
  const refuse = (field: string, message: string): never => {
    throw new NumericalError('RECIPE_INVALID', message, { details: { field } });
  };
  if (!(bufferKm > 0 && bufferKm < Infinity)) refuse('bufferKm', `The buffer must be a positive distance in km; ${bufferKm} was given.`);
  if (!(growth >= 1.05 && growth <= 3)) refuse('growth', `The growth must lie between 1.05 and 3; ${growth} was given.`);
  if (coreSpacingKm !== undefined && !(coreSpacingKm > 0 && coreSpacingKm < Infinity))
    refuse('coreSpacingKm', `The core spacing must be a positive distance in km; ${coreSpacingKm} was given.`);
};

const tooLarge = (boundaryNodes: number): NumericalError =>
  new NumericalError(
    'MESH_TOO_LARGE',
    `The outer boundary alone would need ${Math.round(boundaryNodes).toLocaleString('en')} nodes; ${MAX_NODES.toLocaleString('en')} is the most for a mesh. Use a larger buffer or core spacing.`,
    { details: { limit: MAX_NODES } },
  );

/** Triangulates observations and boundary together; boundary edges that are missing are split in the middle until all are there. */
const triangulateWithin = (domain: Domain, ring: Float64Array, curvature: Float64Array): { triangulation: Triangulation; boundaryCount: number } => {
  const count = domain.points.length / 2;
  let vertices = ring;
  let marks = curvature;
  for (let round = 0; round < 20; round++) {
    const points = new Float64Array(domain.points.length + vertices.length);
    points.set(domain.points);
    points.set(vertices, domain.points.length);
    const t = triangulate(points);
    const loop = Uint32Array.from({ length: vertices.length / 2 }, (_, k) => count + k);
    const missing = cutToLoops(t, [loop], [marks]);
    if (missing.length === 0) {
      checkAllUsed(t, count);
      return { triangulation: t, boundaryCount: loop.length };
    }
    const isMissing = new Set(missing.map(([, k]) => k));
    const longer: number[] = [];
    const longerMarks: number[] = [];
    for (let k = 0; k < loop.length; k++) {
      const x = vertices[2 * k], y = vertices[2 * k + 1];
      longer.push(x, y);
      longerMarks.push(marks[k]);
      if (!isMissing.has(k)) continue;
      const j = (k + 1) % loop.length;
      longer.push((x + vertices[2 * j]) / 2, (y + vertices[2 * j + 1]) / 2);
      longerMarks.push(marks[k]);
    }
    vertices = Float64Array.from(longer);
    marks = Float64Array.from(longerMarks);
  }
  throw new NumericalError(
    'NOT_CONVERGED',
    'The outer boundary could not be fitted into the triangulation: its vertices are too close together for the precision of the coordinates. Use a larger buffer, or bring coordinates far from zero closer to it.',
  );
};

const checkAllUsed = (t: Triangulation, count: number): void => {
  const used = new Uint8Array(t.vertexCount);
  for (let e = 0; e < 3 * t.triangleCount; e++) used[t.triangles[e]] = 1;
  for (let i = 0; i < count; i++)
    if (!used[i])
      throw new NumericalError(
        'POINTS_TOO_CLOSE',
        `Observation ${i} lies so close to another one that both have the same place in the mesh. Combine or thin near observations by a small distance.`,
        { details: { observation: i } },
      );
};

/**
 * Sizes that refinement starts from: at observations the mean of their three shortest edges to other observations,
 * where that is finer than the size function; then no two joined vertices differ by more than the slope allows.
 */
const startingSizes = (
  t: Triangulation,
  count: number,
  sizeAt: (x: number, y: number) => number,
  slope: number,
  scaleAt: ((x: number, y: number) => number) | undefined,
): Float64Array => {
  const { points: p, triangles } = t;
  const size = new Float64Array(t.vertexCount);
  const edgeCount = 3 * t.triangleCount;
  const length = new Float64Array(edgeCount);
  const nearest = new Float64Array(3 * count).fill(Infinity);
  const note = (i: number, d: number): void => {
    for (let k = 3 * i; k < 3 * i + 3; k++)
      if (d < nearest[k]) {
        const pushed = nearest[k];
        nearest[k] = d;
        d = pushed;
      }
  };
  for (let e = 0; e < edgeCount; e++) {
    const a = triangles[e], b = triangles[e % 3 === 2 ? e - 2 : e + 1];
    const scale = scaleAt ? scaleAt((p[2 * a] + p[2 * b]) / 2, (p[2 * a + 1] + p[2 * b + 1]) / 2) : 1;
    length[e] = planeDistance(p[2 * a], p[2 * a + 1], p[2 * b], p[2 * b + 1]) / scale;
    // an inner edge is met from both sides: count it from the first
    if (a < count && b < count && !(t.twins[e] >= 0 && t.twins[e] < e)) {
      note(a, length[e]);
      note(b, length[e]);
    }
  }
  for (let i = 0; i < t.vertexCount; i++) {
    size[i] = sizeAt(p[2 * i], p[2 * i + 1]);
    if (i >= count) continue;
    let sum = 0, terms = 0;
    for (let k = 3 * i; k < 3 * i + 3; k++)
      if (nearest[k] < Infinity) {
        sum += nearest[k];
        terms++;
      }
    if (terms > 0) size[i] = Math.min(size[i], sum / terms);
  }
  for (let sweep = 0; sweep < 4; sweep++) {
    let changed = false;
    for (let k = 0; k < edgeCount; k++) {
      const e = sweep % 2 === 0 ? k : edgeCount - 1 - k;
      const a = triangles[e], b = triangles[e % 3 === 2 ? e - 2 : e + 1];
      const step = slope * length[e];
      if (size[a] > size[b] + step) {
        size[a] = size[b] + step;
        changed = true;
      } else if (size[b] > size[a] + step) {
        size[b] = size[a] + step;
        changed = true;
      }
    }
    if (!changed) break;
  }
  return size;
};

interface Collected {
  count: number;
  boundaryCount: number;
  coreSpacingKm: number;
  localSpacingKm: Float64Array;
  radiusKm: number;
}

const collectMesh = (t: Triangulation, domain: Domain, selected: SelectedObservations, facts: Collected): DesignedMesh => {
  const { count, coreSpacingKm, localSpacingKm } = facts;
  const nodes = t.vertexCount;
  const coordinates = new Float64Array(2 * nodes);
  const nodeKind = new Uint8Array(nodes);
  const nodeObservation = new Int32Array(nodes).fill(-1);
  const observationNode = new Uint32Array(count);
  for (let i = 0; i < nodes; i++) {
    const x = t.points[2 * i], y = t.points[2 * i + 1];
    if (i < count) {
      coordinates[2 * i] = selected.x[i];
      coordinates[2 * i + 1] = selected.y[i];
      nodeObservation[i] = i;
      observationNode[i] = i;
      nodeKind[i] = NODE_KIND.observation;
      continue;
    }
    nodeKind[i] = domain.distanceOutside(x, y) > 0 ? NODE_KIND.buffer : NODE_KIND.core;
    if (domain.projection) domain.projection.inverse(x, y, coordinates, 2 * i);
    else {
      coordinates[2 * i] = x;
      coordinates[2 * i + 1] = y;
    }
  }
  const { loops, curvature } = traceBoundary(t);
  for (const loop of loops) for (const i of loop) if (i >= count) nodeKind[i] = NODE_KIND.boundary;
  const mesh: Mesh = {
    crs: selected.crs,
    radiusKm: selected.crs === 'lonlat-deg' ? facts.radiusKm : 0,
    coordinates,
    triangles: t.triangles.slice(0, 3 * t.triangleCount),
  };
  return {
    ...mesh,
    nodeKind,
    nodeObservation,
    observationNode,
    boundaryLoops: loops,
    boundaryCurvature: curvature,
    outline: [domain.outline],
    outlineCorners: domain.corners.map((corner) => ({ ...corner })),
    localSpacingKm,
    coreSpacingKm,
  };
};

/** Boundary loops, the domain on the left, and the mark of each of their edges. */
const traceBoundary = (t: Triangulation): { loops: Uint32Array[]; curvature: Float64Array } => {
  const edgeFrom = new Map<number, number>();
  for (let e = 0; e < 3 * t.triangleCount; e++) if (t.twins[e] < 0) edgeFrom.set(t.triangles[e], e);
  const loops: Uint32Array[] = [];
  const curvature: number[] = [];
  for (const first of [...edgeFrom.keys()].sort((a, b) => a - b)) {
    if (!edgeFrom.has(first)) continue;
    const loop: number[] = [];
    for (let node = first; edgeFrom.has(node); ) {
      const e = edgeFrom.get(node)!;
      edgeFrom.delete(node);
      loop.push(node);
      curvature.push(t.edgeMarks[e]);
      node = t.triangles[e % 3 === 2 ? e - 2 : e + 1];
    }
    loops.push(Uint32Array.from(loop));
  }
  return { loops, curvature: Float64Array.from(curvature) };
};
