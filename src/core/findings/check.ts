/** The check of a mesh against a correlation model: every finding, judged by the policy, and the figures beside them. */
import { predictBoundaryEffect } from '#core/correlation/boundary-effect.ts';
import { distanceToBoundary } from '#core/correlation/boundary-distance.ts';
import type { CorrelationModel } from '#core/correlation/model.ts';
import { NumericalError } from '#core/errors.ts';
import type { MeshMatrices } from '#core/fem/assembly.ts';
import { assembleFromPositions } from '#core/fem/assembly.ts';
import { nodePositions } from '#core/geometry/positions.ts';
import type { ElementQuality } from '#core/geometry/quality.ts';
import { elementQuality } from '#core/geometry/quality.ts';
import { accurateSum } from '#core/sparse/accurate-sum.ts';
import { estimateCurvature } from './boundary-curvature.ts';
import type { BoundaryFigures } from './boundary-findings.ts';
import { boundaryFindings } from './boundary-findings.ts';
import type { CheckedMesh } from './checked-mesh.ts';
import type { Finding, FindingPolicy } from './finding.ts';
import { quantile, withVerdict } from './judge.ts';
import { absoluteRowSums, diagonalFigures, matrixFigures, matrixFindings } from './matrix-findings.ts';
import type { MatrixFigures } from './matrix-findings.ts';
import { FINDING_IDS, mergePolicy } from './policy.ts';
import { positivePairs, qualityFindings } from './quality-findings.ts';
import { coreSpacing, resolutionFindings } from './resolution-findings.ts';
import type { MeshTopology } from './topology.ts';
import { meshTopology } from './topology.ts';
import { validityFindings } from './validity-findings.ts';

/** Bins of the two histograms. */
export const HISTOGRAM_BINS = 30;

export interface CheckRequest {
  mesh: CheckedMesh;
  model: CorrelationModel;
  /** Limits that replace the defaults, by finding id. */
  policy?: FindingPolicy;
  /** Rows of the observation set behind the observations. */
  rowsSelected: number;
  onPhase?: (phase: string, fraction: number) => void;
  isCancelled?: () => boolean;
}

/** Worst, 95th percentile and median over the observations, and the observation that has the worst (-1: none). */
export interface EffectFigures {
  worst: number;
  p95: number;
  median: number;
  observation: number;
}

/** Measured beside the findings; `schemas/findings.ts` has the same shape. */
export interface CheckFigures {
  nodes: number;
  elements: number;
  observations: number;
  rowsSelected: number;
  areaKm2: number;
  boundaryLoops: number;
  coreSpacingKm: number;
  matrices: {
    mass: MatrixFigures;
    lumpedMass: MatrixFigures;
    stiffness: MatrixFigures & { maxAbsRowSum: number; positiveOffDiagonals: number };
  };
  smallestAngleHistogram: number[];
  qualityHistogram: number[];
  predictedBoundaryEffect: { variance: EffectFigures; correlation: EffectFigures };
}

/**
 * Checks a mesh. Broken meshes give failing findings, not errors; elements without area are left out of the matrices.
 * Throws CANCELLED when asked to stop, MODEL_INVALID or RECIPE_INVALID for a bad model or policy, MESH_INVALID for no
 * elements at all and INPUT_NOT_FINITE for a coordinate that is no number.
 */
export function checkMesh(request: CheckRequest): { findings: Finding[]; figures: CheckFigures } {
  const { mesh, model } = request;
  const limits = mergePolicy(model, request.policy);
  checkInput(mesh);
  const enter = (phase: string, fraction: number) => {
    if (request.isCancelled?.()) throw new NumericalError('CANCELLED', 'The check was cancelled.');
    request.onPhase?.(phase, fraction);
  };

  enter('topology', 0);
  const positions = nodePositions(mesh);
  const topology = meshTopology(mesh);
  enter('quality', 0.25);
  const quality = soundQuality(mesh, positions, topology);
  const core = coreSpacing(mesh, positions);
  enter('assembly', 0.4);
  const { matrices, skipped } = assembleSound(mesh, positions, topology, quality);
  enter('boundary', 0.7);
  const boundary = boundaryFigures(mesh, positions, topology, model);
  enter('findings', 0.85);
  const areaKm2 = accurateSum(quality.areaKm2.map(Math.abs));
  const measured = [
    ...validityFindings(mesh, positions, topology, quality),
    ...qualityFindings(mesh, positions, topology, quality, matrices?.stiffness ?? null, limits),
    ...resolutionFindings(core, model, limits),
    ...matrixFindings(matrices, areaKm2, skipped),
    ...boundaryFindings(mesh, boundary, model, limits),
  ];
  const findings = measured.map((m) => withVerdict(m, limits)).sort((a, b) => order(a) - order(b));
  const figures: CheckFigures = {
    nodes: topology.nodes,
    elements: topology.elements,
    observations: mesh.observationNode?.length ?? 0,
    rowsSelected: request.rowsSelected,
    areaKm2,
    boundaryLoops: topology.loops.length,
    coreSpacingKm: mesh.coreSpacingKm ?? quantile(core.meanEdgeKm, 0.5) ?? 0,
    matrices: figuresOf(matrices),
    smallestAngleHistogram: histogram(quality.smallestAngle, 60),
    qualityHistogram: histogram(quality.meanRatio, 1),
    predictedBoundaryEffect: {
      variance: effectFigures(boundary?.effect.variance),
      correlation: effectFigures(boundary?.effect.correlation),
    },
  };
  enter('done', 1);
  return { findings, figures };
}

const order = (finding: Finding): number => FINDING_IDS.indexOf(finding.id as (typeof FINDING_IDS)[number]);

function checkInput(mesh: CheckedMesh): void {
  if (mesh.triangles.length === 0 || mesh.triangles.length % 3 !== 0)
    throw new NumericalError('MESH_INVALID', `The mesh has ${mesh.triangles.length} element corners. Give three node indices per element and at least one element.`, { details: { corners: mesh.triangles.length } });
  for (let k = 0; k < mesh.coordinates.length; k++)
    if (!Number.isFinite(mesh.coordinates[k]))
      throw new NumericalError('INPUT_NOT_FINITE', `Coordinate ${k % 2} of node ${Math.floor(k / 2)} is not a finite number. Correct the node or leave it out.`, { details: { node: Math.floor(k / 2) } });
  if (mesh.crs === 'lonlat-deg' && !(mesh.radiusKm > 0))
    throw new NumericalError('MESH_INVALID', 'A mesh in longitude and latitude needs the radius of its sphere. Give it in km, such as 6371.', { details: { field: 'radiusKm' } });
}

/** Quality with the malformed elements as degenerate ones. */
function soundQuality(mesh: CheckedMesh, positions: Float64Array, topology: MeshTopology): ElementQuality {
  if (topology.malformed.length === 0) return elementQuality(mesh, positions);
  const triangles = mesh.triangles.slice();
  for (const e of topology.malformed) triangles.fill(0, 3 * e, 3 * e + 3);
  return elementQuality({ ...mesh, triangles }, positions);
}

function assembleSound(mesh: CheckedMesh, positions: Float64Array, topology: MeshTopology, quality: ElementQuality): { matrices: MeshMatrices | null; skipped: number } {
  const isBad = new Uint8Array(topology.elements);
  let skipped = 0;
  for (const e of topology.malformed) isBad[e] = 1;
  quality.areaKm2.forEach((area, e) => {
    if (area === 0) isBad[e] = 1;
  });
  for (const bad of isBad) skipped += bad;
  if (skipped === topology.elements) return { matrices: null, skipped };
  const triangles = skipped === 0 ? mesh.triangles : mesh.triangles.filter((_, h) => isBad[Math.floor(h / 3)] === 0);
  return { matrices: assembleFromPositions(positions, triangles), skipped };
}

function boundaryFigures(mesh: CheckedMesh, positions: Float64Array, topology: MeshTopology, model: CorrelationModel): BoundaryFigures | null {
  const nodes = mesh.observationNode?.filter((node) => node < topology.nodes);
  if (!nodes || nodes.length === 0 || nodes.length !== mesh.observationNode?.length) return null;
  const at = new Float64Array(2 * nodes.length);
  nodes.forEach((node, i) => at.set(mesh.coordinates.subarray(2 * node, 2 * node + 2), 2 * i));
  const boundaryLoops = mesh.boundaryLoops ?? topology.loops;
  const boundaryCurvature = mesh.boundaryCurvature ?? estimateCurvature(boundaryLoops, positions, mesh.crs === 'lonlat-deg');
  const outline = { crs: mesh.crs, radiusKm: mesh.radiusKm, coordinates: mesh.coordinates, boundaryLoops, boundaryCurvature };
  return { effect: predictBoundaryEffect(outline, at, model), distanceKm: distanceToBoundary(outline, at) };
}

function figuresOf(matrices: MeshMatrices | null): CheckFigures['matrices'] {
  const none = { sum: 0, trace: 0, frobenius: 0, nonZeros: 0 };
  if (!matrices) return { mass: none, lumpedMass: none, stiffness: { ...none, maxAbsRowSum: 0, positiveOffDiagonals: 0 } };
  return {
    mass: matrixFigures(matrices.mass),
    lumpedMass: diagonalFigures(matrices.lumpedMass),
    stiffness: {
      ...matrixFigures(matrices.stiffness),
      maxAbsRowSum: absoluteRowSums(matrices.stiffness).reduce((most, sum) => Math.max(most, sum), 0),
      positiveOffDiagonals: positivePairs(matrices.stiffness).pairs.length,
    },
  };
}

function histogram(values: Float64Array, end: number): number[] {
  const bins = new Array<number>(HISTOGRAM_BINS).fill(0);
  for (const value of values) bins[Math.min(HISTOGRAM_BINS - 1, Math.max(0, Math.floor((value / end) * HISTOGRAM_BINS)))]++;
  return bins;
}

function effectFigures(values: Float64Array | undefined): EffectFigures {
  if (!values || values.length === 0) return { worst: 0, p95: 0, median: 0, observation: -1 };
  let observation = 0;
  values.forEach((value, i) => {
    if (value > values[observation]) observation = i;
  });
  return { worst: values[observation], p95: quantile(values, 0.95) ?? 0, median: quantile(values, 0.5) ?? 0, observation };
}
