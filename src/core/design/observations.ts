import type { CoordinateReference } from '#core/geometry/mesh.ts';

/** A column of repeated labels: `names[codes[i]]` is row i's label; an empty string means none. */
export interface LabelColumn {
  names: string[];
  codes: Uint32Array;
}

/** A parsed observation set, column by column; all columns have the same length. NaN means "not given". */
export interface ObservationColumns {
  crs: CoordinateReference;
  /** Longitude in degrees in [-180, 180), or x in km. Always finite. */
  x: Float64Array;
  /** Latitude in degrees in [-90, 90], or y in km. Always finite. */
  y: Float64Array;
  /** Line of the row in the original file, counted from 1 (GeoJSON: number of the feature, from 1). */
  line: Uint32Array;
  value?: Float64Array;
  /** Second component of a two-component observation. */
  value2?: Float64Array;
  /** Observation-error standard deviation, positive. */
  errorSd?: Float64Array;
  /** Seconds since 1970-01-01T00:00:00Z. */
  time?: Float64Array;
  level?: Float64Array;
  station?: LabelColumn;
  flag?: LabelColumn;
}

export const observationCount = (columns: ObservationColumns): number => columns.x.length;
