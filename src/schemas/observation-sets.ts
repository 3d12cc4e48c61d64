import { z } from 'zod/v4';

import { listQuerySchema } from './list.ts';

/** A column of the file, by its index from 0 (CSV) or by its property name (GeoJSON). */
const column = z.union([z.int().min(0).max(10_000), z.string().min(1).max(200)]);

/** How the file's columns become an observation set; absent: detected from the header. */
export const mappingSchema = z.strictObject({
  coordinates: z.enum(['lonlat', 'plane']),
  /** Longitude or x. Not needed for GeoJSON, whose geometry gives it. */
  x: column.optional(),
  y: column.optional(),
  /** Unit of projected x and y. */
  planeUnit: z.enum(['km', 'm']).default('km'),
  value: column.optional(),
  value2: column.optional(),
  errorSd: column.optional(),
  time: column.optional(),
  level: column.optional(),
  station: column.optional(),
  flag: column.optional(),
  /** CSV only; absent: detected. */
  delimiter: z.enum([',', ';', '\t', '|', ' ']).optional(),
  hasHeader: z.boolean().optional(),
  decimalComma: z.boolean().optional(),
});
export type Mapping = z.infer<typeof mappingSchema>;

export const rejectedRowSchema = z.object({
  line: z.int(),
  field: z.string(),
  /** The text found, cut to 200 characters. */
  found: z.string(),
  reason: z.string(),
});
export type RejectedRow = z.infer<typeof rejectedRowSchema>;

/** Query of `/rejected`: a page as JSON, or all of them as a CSV file. */
export const rejectedQuerySchema = listQuerySchema.extend({ format: z.enum(['json', 'csv']).default('json') });

export const observationSetSchema = z.object({
  id: z.string(),
  studyId: z.string(),
  name: z.string(),
  fileName: z.string(),
  byteLength: z.int(),
  /** Lower-case hexadecimal SHA-256 of the original bytes. */
  sha256: z.string(),
  format: z.enum(['csv', 'geojson']),
  crs: z.enum(['lonlat-deg', 'plane-km']),
  mapping: mappingSchema,
  rowsRead: z.int(),
  accepted: z.int(),
  rejectedCount: z.int(),
  /** Which optional columns there are. */
  columns: z.array(z.enum(['value', 'value2', 'errorSd', 'time', 'level', 'station', 'flag'])),
  flags: z.array(z.object({ name: z.string(), count: z.int() })),
  /** Smallest box in the set's coordinates; for longitudes across the antimeridian `west` > `east`. */
  extent: z.object({ west: z.number(), south: z.number(), east: z.number(), north: z.number() }),
  timeRange: z.object({ from: z.number(), to: z.number() }).nullable(),
  levelRange: z.object({ min: z.number(), max: z.number() }).nullable(),
  createdBy: z.string(),
  createdAt: z.string(),
});
export type ObservationSet = z.infer<typeof observationSetSchema>;

/** Result of the upload job. */
export const uploadResultSchema = z.object({
  observationSetId: z.string(),
  rowsRead: z.int(),
  accepted: z.int(),
  rejectedCount: z.int(),
});

/** One row of `GET /observation-sets/{o}/points`. */
export const observationPointSchema = z.object({
  index: z.int(),
  line: z.int(),
  x: z.number(),
  y: z.number(),
  value: z.number().nullable(),
  value2: z.number().nullable(),
  errorSd: z.number().nullable(),
  time: z.number().nullable(),
  level: z.number().nullable(),
  station: z.string().nullable(),
  flag: z.string().nullable(),
});
export type ObservationPoint = z.infer<typeof observationPointSchema>;

export const POINT_SORT_KEYS = ['index', 'line', 'x', 'y', 'value', 'value2', 'errorSd', 'time', 'level', 'station', 'flag'] as const;

/** Query of `/points`: page by offset, sorted and filtered on the server. */
export const pointsQuerySchema = z.object({
  offset: z.coerce.number().int().min(0).default(0),
  limit: z.coerce.number().int().min(1).max(1000).default(100),
  sort: z.enum(POINT_SORT_KEYS).default('index'),
  order: z.enum(['asc', 'desc']).default('asc'),
  /** Case-insensitive substring of station or flag, or of the line number. */
  search: z.string().max(200).optional(),
  flag: z.string().max(200).optional(),
});
export const pointsPageSchema = z.object({
  items: z.array(observationPointSchema),
  total: z.int(),
  nextCursor: z.string().nullable(),
});
export type PointsPage = z.infer<typeof pointsPageSchema>;
