import { z } from 'zod/v4';

import type { Finding as CoreFinding } from '#core/findings/finding.ts';

export const verdictSchema = z.enum(['pass', 'warn', 'fail', 'not-judged']);

export const findingSchema = z.object({
  id: z.string(),
  group: z.enum(['validity', 'quality', 'resolution', 'matrices', 'boundary']),
  title: z.string(),
  value: z.number().nullable(),
  unit: z.string(),
  limit: z.object({
    direction: z.enum(['above', 'below']),
    warn: z.number().nullable(),
    fail: z.number().nullable(),
  }),
  verdict: verdictSchema,
  explanation: z.string(),
  source: z.string(),
  place: z.object({
    elements: z.array(z.int()).optional(),
    nodes: z.array(z.int()).optional(),
    observations: z.array(z.int()).optional(),
  }),
  placeCount: z.int(),
});
export type Finding = z.infer<typeof findingSchema>;
const _sameAsCore = (f: Finding): CoreFinding => f;
void _sameAsCore;

const matrixFigures = z.object({ sum: z.number(), trace: z.number(), frobenius: z.number(), nonZeros: z.int() });

/** What a check measured, beside its findings. */
export const checkFiguresSchema = z.object({
  nodes: z.int(),
  elements: z.int(),
  observations: z.int(),
  /** Rows of the observation set behind those observations. */
  rowsSelected: z.int(),
  areaKm2: z.number(),
  boundaryLoops: z.int(),
  coreSpacingKm: z.number(),
  matrices: z.object({
    mass: matrixFigures,
    lumpedMass: matrixFigures,
    stiffness: matrixFigures.extend({ maxAbsRowSum: z.number(), positiveOffDiagonals: z.int() }),
  }),
  /** Histogram counts over equal bins from 0 to 60 degrees of each element's smallest angle. */
  smallestAngleHistogram: z.array(z.int()),
  /** Histogram counts over equal bins from 0 to 1 of the mean-ratio quality. */
  qualityHistogram: z.array(z.int()),
  predictedBoundaryEffect: z.object({
    variance: z.object({ worst: z.number(), p95: z.number(), median: z.number(), observation: z.int() }),
    correlation: z.object({ worst: z.number(), p95: z.number(), median: z.number(), observation: z.int() }),
  }),
});
export type CheckFigures = z.infer<typeof checkFiguresSchema>;

/** Result of a check job and part of a version. `meshHash` is the SHA-256 of topology and coordinates. */
export const checkResultSchema = z.object({
  meshHash: z.string(),
  findings: z.array(findingSchema),
  figures: checkFiguresSchema,
  /** Milliseconds by phase. */
  timings: z.record(z.string(), z.number()),
  /** Design revision that was checked. */
  revision: z.int(),
});
export type CheckResult = z.infer<typeof checkResultSchema>;
