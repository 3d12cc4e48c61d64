import { z } from 'zod/v4';

import type { Recipe } from '#core/design/recipe.ts';

const coordinate = z.number().min(-1e9).max(1e9);
const ring = z
  .array(z.tuple([coordinate, coordinate]))
  .min(3, 'A polygon needs at least three corners.')
  .max(10_000, 'A polygon may have at most 10,000 corners.');

export const selectionSchema = z.strictObject({
  flags: z.array(z.string().max(200)).max(1000).optional(),
  timeWindow: z.strictObject({ from: z.number(), to: z.number() }).optional(),
  level: z.strictObject({ min: z.number(), max: z.number() }).optional(),
  near: z.strictObject({ km: z.number().min(0).max(10_000), rule: z.enum(['combine', 'thin', 'refuse']) }),
  keepInside: ring.optional(),
  leaveOut: ring.optional(),
});

export const recipeSchema = z.strictObject({
  selection: selectionSchema,
  outline: z.discriminatedUnion('kind', [
    z.strictObject({ kind: z.literal('convex') }),
    z.strictObject({ kind: z.literal('box') }),
  ]),
  bufferKm: z.number().min(0.001, 'The buffer must be a positive distance in km.').max(20_000),
  corners: z.enum(['round', 'square']),
  coreSpacingKm: z.number().positive('The core spacing must be a positive distance in km.').max(20_000).optional(),
  growth: z.number().min(1.05, 'The growth must be at least 1.05.').max(3, 'The growth may be at most 3.'),
});

export type RecipeInput = z.infer<typeof recipeSchema>;
const _sameAsCore = (r: RecipeInput): Recipe => r;
void _sameAsCore;
