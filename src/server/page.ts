import { AppError } from './errors.ts';

/** What a page shows instead of itself, or null where the error is none that a person can act on. */
export interface PageProblem {
  status: number;
  title: string;
  message: string;
}

/** Runs what a page needs; an error that can be explained becomes a problem to show. */
export const loadPage = async <T>(load: () => Promise<T>): Promise<{ data: T; problem: null } | { data: null; problem: PageProblem }> => {
  try {
    return { data: await load(), problem: null };
  } catch (error) {
    if (!(error instanceof AppError) || error.status >= 500) throw error;
    return { data: null, problem: { status: error.status, title: error.status === 404 ? 'Not found' : 'Not allowed', message: error.message } };
  }
};
