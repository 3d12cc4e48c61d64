import type { NumericalErrorCode } from '#core/errors.ts';

/** HTTP status by code. Codes are permanent: scripts match on them. */
export const STATUS_BY_CODE = {
  VALIDATION_FAILED: 422,
  BODY_NOT_JSON: 400,
  BODY_TOO_LARGE: 413,
  MEDIA_TYPE_UNSUPPORTED: 415,
  BAD_REQUEST: 400,
  CURSOR_INVALID: 400,
  ORIGIN_REFUSED: 403,
  NOT_SIGNED_IN: 401,
  SIGN_IN_FAILED: 401,
  PASSWORD_WRONG: 403,
  PASSWORD_CHANGE_REQUIRED: 403,
  FORBIDDEN: 403,
  NOT_FOUND: 404,
  METHOD_NOT_ALLOWED: 405,
  CONFLICT: 409,
  ALREADY_EXISTS: 409,
  DESIGN_CHANGED: 409,
  IN_USE: 409,
  LAST_ADMIN: 409,
  JOB_FINISHED: 409,
  FINDINGS_FAIL: 409,
  NOT_READY: 409,
  RATE_LIMITED: 429,
  INTERNAL: 500,
  UNAVAILABLE: 503,
} as const satisfies Record<string, number>;

export type AppErrorCode = keyof typeof STATUS_BY_CODE;

export interface FieldProblem {
  /** Where in the request: `recipe.bufferKm`, `points.3.x`; '' for the whole. */
  path: string;
  message: string;
}

export interface AppErrorOptions {
  /** Overrides the status of the code. */
  status?: number;
  /** Machine-readable facts; never a secret. */
  details?: Record<string, unknown>;
  fields?: FieldProblem[];
  /** Further response headers, such as Retry-After. */
  headers?: Record<string, string>;
  cause?: unknown;
}

/** A failure that the server can explain. The message says what happened and then what to do. */
export class AppError extends Error {
  readonly code: AppErrorCode;
  readonly status: number;
  readonly details: Record<string, unknown> | undefined;
  readonly fields: FieldProblem[] | undefined;
  readonly headers: Record<string, string>;

  constructor(code: AppErrorCode, message: string, options: AppErrorOptions = {}) {
    super(message, { cause: options.cause });
    this.name = 'AppError';
    this.code = code;
    this.status = options.status ?? STATUS_BY_CODE[code];
    this.details = options.details;
    this.fields = options.fields;
    this.headers = options.headers ?? {};
  }
}

/** Short names of statuses, the `title` of problem details. */
export const TITLE_BY_STATUS: Record<number, string> = {
  400: 'Bad request',
  401: 'Not signed in',
  403: 'Not allowed',
  404: 'Not found',
  405: 'Method not allowed',
  409: 'Conflict',
  413: 'Too large',
  415: 'Unsupported media type',
  422: 'Not valid',
  429: 'Too many requests',
  500: 'Internal error',
  503: 'Unavailable',
};

/** Numerical failures are the request's fault (422) but for these. */
export const NUMERICAL_STATUS: Partial<Record<NumericalErrorCode, number>> = {
  FILE_TOO_LARGE: 413,
  CANCELLED: 409,
};

/** "Not found", the same whether the thing is missing or belongs to another team. */
export function notFound(what: string): AppError {
  return new AppError('NOT_FOUND', `There is no such ${what}, or you have no access to it. Check the address.`);
}
