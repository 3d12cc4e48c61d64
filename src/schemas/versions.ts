import { z } from 'zod/v4';

import { correlationSchema } from './correlation.ts';
import { checkFiguresSchema, findingSchema } from './findings.ts';
import { recipeSchema } from './recipe.ts';

export const VERSION_STATES = ['saved', 'in-review', 'approved', 'returned', 'superseded', 'withdrawn'] as const;
export const versionStateSchema = z.enum(VERSION_STATES);

/** `revision` of the design to save; `reason` is needed when a finding fails, and is kept as the waiver. */
export const saveVersionSchema = z.strictObject({
  revision: z.int().min(1),
  note: z.string().trim().max(2000).default(''),
  reason: z.string().trim().min(1).max(2000).optional(),
});

export const versionSummarySchema = z.object({
  id: z.string(),
  studyId: z.string(),
  /** Counted from 1 within the study. */
  number: z.int(),
  state: versionStateSchema,
  designName: z.string(),
  observationSetId: z.string(),
  meshHash: z.string(),
  nodes: z.int(),
  elements: z.int(),
  verdict: z.enum(['pass', 'warn', 'fail']),
  note: z.string(),
  savedBy: z.object({ id: z.string(), name: z.string() }),
  savedAt: z.string(),
});
export type VersionSummary = z.infer<typeof versionSummarySchema>;

export const versionSchema = versionSummarySchema.extend({
  designId: z.string().nullable(),
  recipe: recipeSchema,
  correlation: correlationSchema,
  findings: z.array(findingSchema),
  figures: checkFiguresSchema,
  /** Why it was saved although a finding failed. */
  waiver: z.string().nullable(),
  softwareVersion: z.string(),
  observationSha256: z.string(),
  caution: z.string(),
});
export type Version = z.infer<typeof versionSchema>;

/** Shown on every version, report and export. */
export const CAUTION =
  'A mesh that passes here is a design aid; before operational use it must be validated in the receiving assimilation system under that organisation’s own procedures.';

export const EXPORT_FORMATS = ['netcdf', 'matrix-market', 'geojson'] as const;
export const exportFormatSchema = z.enum(EXPORT_FORMATS);
export type ExportFormat = z.infer<typeof exportFormatSchema>;

export const exportSchema = z.object({
  format: exportFormatSchema,
  fileName: z.string(),
  mediaType: z.string(),
  /** Lower-case hexadecimal SHA-256 of the file. */
  sha256: z.string(),
  description: z.string(),
  url: z.string(),
});
export type ExportEntry = z.infer<typeof exportSchema>;

export const rebuildResultSchema = z.object({
  expectedHash: z.string(),
  rebuiltHash: z.string(),
  reproduced: z.boolean(),
  observationSha256: z.string(),
});
