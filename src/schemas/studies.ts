import { z } from 'zod/v4';

import { correlationSchema } from './correlation.ts';

export const createStudySchema = z.strictObject({
  name: z.string().trim().min(1, 'Give the study a name.').max(120),
  description: z.string().trim().max(2000).default(''),
  correlation: correlationSchema,
});
/** What is absent stays as it is. */
export const updateStudySchema = z.strictObject({
  name: createStudySchema.shape.name.optional(),
  description: z.string().trim().max(2000).optional(),
  correlation: correlationSchema.optional(),
});

export const studySchema = z.object({
  id: z.string(),
  teamId: z.string(),
  name: z.string(),
  description: z.string(),
  correlation: correlationSchema,
  createdBy: z.string(),
  createdAt: z.string(),
  updatedAt: z.string(),
  observationSetCount: z.int(),
  designCount: z.int(),
  versionCount: z.int(),
});
export type Study = z.infer<typeof studySchema>;
