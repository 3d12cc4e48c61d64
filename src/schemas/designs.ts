import { z } from 'zod/v4';

import { correlationSchema } from './correlation.ts';
import { recipeSchema } from './recipe.ts';

export const createDesignSchema = z.strictObject({
  name: z.string().trim().min(1, 'Give the design a name.').max(120),
  observationSetId: z.uuid(),
  /** Absent: a recipe derived from the observation set and the correlation model. */
  recipe: recipeSchema.optional(),
  /** Absent: the study's. */
  correlation: correlationSchema.optional(),
});

/** `revision` is the one the client started from; an older one answers 409 DESIGN_CHANGED with the newer design in `details.current`. */
export const updateDesignSchema = z.strictObject({
  revision: z.int().min(1),
  name: z.string().trim().min(1).max(120).optional(),
  recipe: recipeSchema.optional(),
  correlation: correlationSchema.nullable().optional(),
});

export const designSchema = z.object({
  id: z.string(),
  studyId: z.string(),
  name: z.string(),
  observationSetId: z.string(),
  recipe: recipeSchema,
  /** Null: the study's correlation model holds. */
  correlation: correlationSchema.nullable(),
  /** The model in force: the design's own, else the study's. */
  effectiveCorrelation: correlationSchema,
  revision: z.int(),
  updatedBy: z.object({ id: z.string(), name: z.string() }),
  updatedAt: z.string(),
  createdAt: z.string(),
  /** The newest check job of this design, whatever its state; `revision` tells whether it is still about this recipe. */
  lastCheck: z.object({ jobId: z.string(), revision: z.int(), state: z.string() }).nullable(),
});
export type Design = z.infer<typeof designSchema>;
