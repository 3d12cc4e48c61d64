import { z } from 'zod/v4';

export const JOB_KINDS = ['read-observations', 'check-design', 'save-version', 'rebuild-version'] as const;
export const jobKindSchema = z.enum(JOB_KINDS);
export type JobKind = z.infer<typeof jobKindSchema>;

export const JOB_STATES = ['queued', 'running', 'paused', 'complete', 'failed', 'cancelled'] as const;
export const jobStateSchema = z.enum(JOB_STATES);
export type JobState = z.infer<typeof jobStateSchema>;

export const jobSchema = z.object({
  id: z.string(),
  kind: jobKindSchema,
  state: jobStateSchema,
  progress: z.object({ fraction: z.number().min(0).max(1), phase: z.string() }),
  /** Shape depends on `kind`; null until complete. */
  result: z.record(z.string(), z.unknown()).nullable(),
  error: z.object({ code: z.string(), message: z.string(), details: z.record(z.string(), z.unknown()).optional() }).nullable(),
  createdAt: z.string(),
  startedAt: z.string().nullable(),
  finishedAt: z.string().nullable(),
});
export type Job = z.infer<typeof jobSchema>;
