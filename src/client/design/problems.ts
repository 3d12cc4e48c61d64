import type { Problem } from '#schemas/problem.ts';

export type KnownProblem = Pick<Problem, 'code' | 'detail' | 'details'>;

/** The problem details behind an error of a request; a network failure and anything else get words of their own. */
export const problemOf = (error: unknown): KnownProblem => {
  const carried = (error as { problem?: Problem } | null)?.problem;
  if (carried) return carried;
  const { code, details } = (error ?? {}) as { code?: unknown; details?: Record<string, unknown> };
  if (error instanceof TypeError) return { code: 'UNREACHABLE', detail: 'The server cannot be reached. Nothing is lost on this page; it is tried again.' };
  const detail = error instanceof Error ? error.message : String(error);
  return { code: typeof code === 'string' ? code : 'UNEXPECTED', detail, ...(details && { details }) };
};
