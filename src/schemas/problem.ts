import { z } from 'zod/v4';

/** RFC 9457 problem details, as every failed request answers them (`application/problem+json`). */
export const problemSchema = z.object({
  type: z.string(),
  title: z.string(),
  status: z.int(),
  /** What happened, and what to do, for a person. */
  detail: z.string(),
  /** Stable, SCREAMING_SNAKE_CASE. */
  code: z.string(),
  requestId: z.string().optional(),
  /** For VALIDATION_FAILED: where in the request, and what is wrong there. */
  fields: z.array(z.object({ path: z.string(), message: z.string() })).optional(),
  details: z.record(z.string(), z.unknown()).optional(),
});
export type Problem = z.infer<typeof problemSchema>;
