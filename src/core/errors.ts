/** Every code that core can raise. Codes are permanent: scripts match on them. */
export type NumericalErrorCode =
  | 'INPUT_NOT_FINITE'
  | 'INPUT_LENGTH_MISMATCH'
  | 'INDEX_OUT_OF_RANGE'
  | 'TOO_FEW_POINTS'
  | 'POINTS_COLLINEAR'
  | 'POINTS_COINCIDE'
  | 'POINTS_TOO_CLOSE'
  | 'POINTS_TOO_WIDE'
  | 'POLYGON_INVALID'
  | 'RECIPE_INVALID'
  | 'MODEL_INVALID'
  | 'SELECTION_EMPTY'
  | 'MESH_INVALID'
  | 'MESH_TOO_LARGE'
  | 'NOT_POSITIVE_DEFINITE'
  | 'NOT_CONVERGED'
  | 'CANCELLED'
  | 'FILE_EMPTY'
  | 'FILE_NOT_TEXT'
  | 'FILE_TOO_LARGE'
  | 'FILE_FORMAT_UNKNOWN'
  | 'FILE_MALFORMED'
  | 'COLUMN_MISSING'
  | 'NO_ROW_ACCEPTED';

export interface ErrorOptions {
  /** Machine-readable facts: the offending index, row, column, field, value or limit. */
  details?: Record<string, unknown>;
  cause?: unknown;
}

/** A failure that core can explain. The message says what happened and then what to do. */
export class NumericalError extends Error {
  readonly code: NumericalErrorCode;
  readonly details: Record<string, unknown>;

  constructor(code: NumericalErrorCode, message: string, options: ErrorOptions = {}) {
    super(message, { cause: options.cause });
    this.name = 'NumericalError';
    this.code = code;
    this.details = options.details ?? {};
  }
}
