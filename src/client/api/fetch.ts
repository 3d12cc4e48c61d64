import type { Problem } from '#schemas/problem.ts';

/** A request that failed, with what the server said about it. */
export class ApiError extends Error {
  readonly problem: Problem;

  constructor(problem: Problem) {
    super(problem.detail);
    this.name = 'ApiError';
    this.problem = problem;
  }

  get code(): string {
    return this.problem.code;
  }

  get status(): number {
    return this.problem.status;
  }

  /** What is wrong with a field of the request, if the server named it. */
  fieldMessage(path: string): string | undefined {
    return this.problem.fields?.find((field) => field.path === path)?.message;
  }
}

const unreachable = (cause: unknown): ApiError => {
  const error = new ApiError({
    type: 'about:blank',
    title: 'No connection',
    status: 0,
    detail: 'The server could not be reached. Nothing was changed. Check the connection and try again.',
    code: 'UNREACHABLE',
  });
  error.cause = cause;
  return error;
};

/** The problem that a failed answer carries, or a plain one. */
export const readProblem = async (response: Response): Promise<Problem> => {
  const plain: Problem = {
    type: 'about:blank',
    title: response.statusText,
    status: response.status,
    detail: `The server answered with status ${response.status}. Try again; if it fails again, tell your administrator.`,
    code: 'INTERNAL',
  };
  if (!/\bjson\b/.test(response.headers.get('content-type') ?? '')) return plain;
  return { ...plain, ...((await response.json()) as Partial<Problem>) };
};

/** A successful answer. A session that has ended leads to the sign-in page and back. @throws ApiError */
export const apiFetch = async (path: string, init?: RequestInit): Promise<Response> => {
  let response: Response;
  try {
    response = await fetch(path, init);
  } catch (cause) {
    if (init?.signal?.aborted) throw cause;
    throw unreachable(cause);
  }
  if (response.ok) return response;
  const problem = await readProblem(response);
  if (problem.code === 'NOT_SIGNED_IN') location.assign(`/sign-in?next=${encodeURIComponent(location.pathname + location.search)}`);
  throw new ApiError(problem);
};

/** The JSON of a successful answer. @throws ApiError */
export const getJson = async <T>(path: string): Promise<T> => (await (await apiFetch(path)).json()) as T;

/** Sends JSON and returns the answer's JSON (undefined for an empty one). @throws ApiError */
export const sendJson = async <T>(method: string, path: string, body?: unknown): Promise<T> => {
  const init: RequestInit = body === undefined ? { method } : { method, headers: { 'content-type': 'application/json' }, body: JSON.stringify(body) };
  const response = await apiFetch(path, init);
  return (response.status === 204 ? undefined : await response.json()) as T;
};
