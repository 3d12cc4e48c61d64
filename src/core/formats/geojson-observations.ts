import { NumericalError } from '#core/errors.ts';

import { mapColumnNames } from './column-names.ts';
import { NOT_POSITIVE } from './csv-observations.ts';
import type { Mapping, ReadOptions, ReadResult } from './mapping.ts';
import { ATTRIBUTE_FIELDS } from './mapping.ts';
import type { ObservationRows } from './observation-rows.ts';
import { createObservationRows, explainLabel, LABEL_FIELDS, NUMBER_FIELDS, tidyLabel } from './observation-rows.ts';
import { placeDegrees } from './parse-coordinate.ts';
import { explainNumber, parseNumber } from './parse-number.ts';
import { explainTime, parseTime } from './parse-time.ts';

/** Parsing holds the whole document in memory several times over; larger sets belong in CSV. */
const DEFAULT_MAX_BYTES = 96 * 2 ** 20;
const DEEPEST_NESTING = 16;
const FEATURES_SNIFFED = 1000;
const PROPERTIES_SHOWN = 200;
const ROWS_SHOWN = 20;
/** Features read between two looks at cancelling and two batches of rejected rows. */
const FEATURES_PER_STEP = 5000;

type Json = Record<string, unknown>;

export interface GeoJsonSniff {
  /** The property names that occur, in order of appearance. */
  columns: { name: string; examples: string[] }[];
  mapping: Mapping;
  /** The first features' properties as text, in the order of `columns`. */
  rows: string[][];
}

const isObject = (value: unknown): value is Json => typeof value === 'object' && value !== null && !Array.isArray(value);

/**
 * The observations of a GeoJSON document (RFC 7946): each Point, and each position of a MultiPoint, of a Feature,
 * FeatureCollection or GeometryCollection is a row; its line is the number of its feature, from 1. Properties are
 * mapped by name (absent: by `mapColumnNames`). Other geometries and null ones are rejected rows. Positions are
 * longitude and latitude unless the mapping says x and y in km or m, as parties may agree by RFC 7946 section 4.
 * @throws NumericalError FILE_NOT_TEXT, FILE_TOO_LARGE, FILE_MALFORMED (with the line), FILE_FORMAT_UNKNOWN,
 * NO_ROW_ACCEPTED, CANCELLED.
 */
export const readGeoJsonObservations = async (
  bytes: Uint8Array,
  mapping: Mapping | undefined,
  options: ReadOptions & { maxBytes?: number } = {},
): Promise<ReadResult> => {
  const document = parseDocument(bytes, options.maxBytes ?? DEFAULT_MAX_BYTES);
  const features = listFeatures(document);
  const used = mapping ? checkedMapping(mapping) : sniffFeatures(features).mapping;
  if (used.coordinates === 'lonlat') checkCrs(document);
  const rows = createObservationRows(used, options);
  for (let at = 0; at < features.length; at += FEATURES_PER_STEP) {
    if (options.isCancelled?.()) throw new NumericalError('CANCELLED', 'Reading the file was cancelled. Nothing was kept.');
    const end = Math.min(features.length, at + FEATURES_PER_STEP);
    for (let k = at; k < end; k++) readFeature(features[k], k + 1, used, rows);
    await rows.flush(false);
    options.onProgress?.({ bytes: Math.round((bytes.length * end) / features.length), rows: rows.rowsRead() });
  }
  await rows.flush(true);
  return rows.finish();
};

/**
 * The property names of a GeoJSON document with examples, and the mapping that they suggest.
 * @throws NumericalError as `readGeoJsonObservations`.
 */
export const sniffGeoJson = (bytes: Uint8Array, { maxBytes = DEFAULT_MAX_BYTES }: { maxBytes?: number } = {}): GeoJsonSniff =>
  sniffFeatures(listFeatures(parseDocument(bytes, maxBytes)));

const sniffFeatures = (features: unknown[]): GeoJsonSniff => {
  const examples = new Map<string, string[]>();
  const sample = features.slice(0, FEATURES_SNIFFED).map((feature) => propertiesOf(feature));
  for (const properties of sample)
    for (const [name, value] of Object.entries(properties)) {
      if (name.length > 200 || (!examples.has(name) && examples.size === PROPERTIES_SHOWN)) continue;
      const seen = examples.get(name) ?? [];
      if (seen.length < 3 && value !== null && value !== '') seen.push(textOf(value));
      examples.set(name, seen);
    }
  const names = [...examples.keys()];
  const { x: _x, y: _y, ...attributes } = mapColumnNames(names, (index) => names[index]);
  return {
    columns: names.map((name) => ({ name, examples: examples.get(name) ?? [] })),
    mapping: { ...attributes, coordinates: 'lonlat', planeUnit: 'km' },
    rows: sample.slice(0, ROWS_SHOWN).map((properties) => names.map((name) => textOf(own(properties, name)))),
  };
};

const propertiesOf = (feature: unknown): Json => (isObject(feature) && isObject(feature.properties) ? feature.properties : {});
const own = (properties: Json, name: string): unknown => (Object.hasOwn(properties, name) ? properties[name] : undefined);
const textOf = (value: unknown): string =>
  value === undefined || value === null ? '' : typeof value === 'object' ? shortJson(value) : String(value).slice(0, 400);

/** Objects and lists are shown by their kind alone: they may be large or deep. */
const shortJson = (value: object): string => (Array.isArray(value) ? `[list of ${value.length}]` : '{object}');

const parseDocument = (bytes: Uint8Array, maxBytes: number): Json => {
  if (bytes.length > maxBytes)
    throw new NumericalError(
      'FILE_TOO_LARGE',
      `The GeoJSON file has ${(bytes.length / 2 ** 20).toFixed(0)} MiB; ${(maxBytes / 2 ** 20).toFixed(0)} MiB are read at most. Save the points as CSV, which has no such limit, or split the file.`,
      { details: { byteLength: bytes.length, maxBytes } },
    );
  let text: string;
  try {
    text = new TextDecoder('utf-8', { fatal: true }).decode(bytes);
  } catch (cause) {
    const line = firstLineNotUtf8(bytes);
    throw new NumericalError('FILE_NOT_TEXT', `Line ${line} is not valid UTF-8. GeoJSON must be UTF-8: save the file with that encoding.`, {
      details: { line },
      cause,
    });
  }
  let document: unknown;
  try {
    document = JSON.parse(text);
  } catch (cause) {
    throw malformedJson(text, cause);
  }
  if (!isObject(document))
    throw new NumericalError('FILE_FORMAT_UNKNOWN', 'The file is JSON, but its top level is not a GeoJSON object. Wrap the points in a FeatureCollection.');
  return document;
};

const firstLineNotUtf8 = (bytes: Uint8Array): number => {
  const decoder = new TextDecoder('utf-8', { fatal: true });
  let line = 1;
  for (let at = 0; at < bytes.length; line++) {
    const next = bytes.indexOf(0x0a, at);
    const end = next < 0 ? bytes.length : next;
    try {
      decoder.decode(bytes.subarray(at, end));
    } catch {
      return line;
    }
    at = end + 1;
  }
  return line;
};

const malformedJson = (text: string, cause: unknown): NumericalError => {
  const position = /position (\d+)/.exec(cause instanceof Error ? cause.message : '')?.[1];
  const line = position === undefined ? null : text.slice(0, Number(position)).split('\n').length;
  const isCut =
    (cause instanceof Error && /end of JSON/i.test(cause.message)) || (position !== undefined && Number(position) >= text.trimEnd().length);
  const isSequence = /^\s*\{[^\n]*\}\s*\n\s*\{/.test(text.slice(0, 10_000));
  const where = isCut ? 'it ends too early' : line === null ? 'a bracket, comma or quote is out of place' : `see line ${line}`;
  const advice = isSequence
    ? 'It looks like one object on each line: join them in one FeatureCollection.'
    : isCut
      ? 'The file may be cut off: copy it again.'
      : 'Correct it there, or write the file again with the program that made it.';
  return new NumericalError('FILE_MALFORMED', `The file starts like GeoJSON but is not valid JSON: ${where}. ${advice}`, { details: { line } });
};

const listFeatures = (document: Json): unknown[] => {
  const { type, features } = document;
  if (type === 'FeatureCollection') {
    if (Array.isArray(features)) return features;
    throw new NumericalError('FILE_MALFORMED', 'The FeatureCollection has no list "features". Write the file again with the program that made it.');
  }
  if (type === 'Feature') return [document];
  if (typeof type === 'string' && GEOMETRIES.has(type)) return [{ type: 'Feature', properties: null, geometry: document }];
  throw new NumericalError(
    'FILE_FORMAT_UNKNOWN',
    `The file is JSON, but its "type" is ${typeof type === 'string' ? `"${type.slice(0, 40)}"` : 'missing'}, which is no GeoJSON type. Wrap the points in a FeatureCollection.`,
  );
};

const GEOMETRIES = new Set(['Point', 'MultiPoint', 'LineString', 'MultiLineString', 'Polygon', 'MultiPolygon', 'GeometryCollection']);

const checkCrs = ({ crs }: Json): void => {
  if (crs === undefined) return;
  const name = isObject(crs) && isObject(crs.properties) ? String(crs.properties.name) : String(crs);
  if (/^(urn:ogc:def:crs:OGC:(1\.3)?:CRS84|OGC:CRS84|CRS84)$/i.test(name)) return;
  throw new NumericalError(
    'FILE_FORMAT_UNKNOWN',
    `The file names the coordinate reference "${name.slice(0, 80)}" in a "crs" member. GeoJSON is longitude and latitude on WGS 84 (RFC 7946 section 4): write it again in that reference, or map the coordinates as projected x and y in km or m.`,
    { details: { crs: name.slice(0, 200) } },
  );
};

const checkedMapping = (mapping: Mapping): Mapping => {
  for (const field of ATTRIBUTE_FIELDS)
    if (typeof mapping[field] === 'number')
      throw new NumericalError(
        'COLUMN_MISSING',
        `${field} is mapped to column ${mapping[field]}, but GeoJSON has properties, not numbered columns. Give the property's name.`,
        { details: { field } },
      );
  return mapping;
};

const readFeature = (feature: unknown, line: number, mapping: Mapping, rows: ObservationRows): void => {
  if (!isObject(feature) || feature.type !== 'Feature') {
    const found = isObject(feature) ? String(feature.type) : textOf(feature);
    rows.reject(line, 'feature', found, 'A FeatureCollection holds Features only. Wrap this in a Feature.');
    return;
  }
  readGeometry(feature.geometry, propertiesOf(feature), line, mapping, rows, 0);
};

const readGeometry = (geometry: unknown, properties: Json, line: number, mapping: Mapping, rows: ObservationRows, depth: number): void => {
  const reject = (found: string, reason: string): void => rows.reject(line, 'geometry', found, reason);
  if (!isObject(geometry)) {
    reject(geometry === null || geometry === undefined ? 'null' : textOf(geometry), 'The feature has no geometry. Give it a Point, or remove it.');
    return;
  }
  const { type, coordinates, geometries } = geometry;
  if (type === 'Point') readPosition(coordinates, properties, line, mapping, rows);
  else if (type === 'MultiPoint' && Array.isArray(coordinates) && coordinates.length > 0)
    for (const position of coordinates) readPosition(position, properties, line, mapping, rows);
  else if (type === 'GeometryCollection' && Array.isArray(geometries) && geometries.length > 0)
    if (depth < DEEPEST_NESTING) for (const part of geometries) readGeometry(part, properties, line, mapping, rows, depth + 1);
    else reject('GeometryCollection', `Geometry collections are nested more than ${DEEPEST_NESTING} deep. Write the points directly.`);
  else if (type === 'MultiPoint' || type === 'GeometryCollection') reject(String(type), 'It holds no points. Remove the feature, or give it some.');
  else reject(textOf(type), 'Only points are observations. Replace the shape by the points that were observed, or remove it.');
};

const readPosition = (position: unknown, properties: Json, line: number, mapping: Mapping, rows: ObservationRows): void => {
  const reject = (found: string, reason: string): void => rows.reject(line, 'coordinates', found, reason);
  if (!Array.isArray(position) || position.length < 2) {
    reject(textOf(position), 'A position is a list of two numbers. Write it as [longitude, latitude].');
    return;
  }
  const [first, second] = position as unknown[];
  const found = `[${textOf(first)}, ${textOf(second)}]`;
  if (typeof first !== 'number' || typeof second !== 'number' || !Number.isFinite(first) || !Number.isFinite(second)) {
    reject(found, 'A position is a list of two finite numbers. Write it as [longitude, latitude].');
    return;
  }
  const isPlane = mapping.coordinates === 'plane';
  const kmPerUnit = mapping.planeUnit === 'm' ? 1000 : 1;
  const x = isPlane ? first / kmPerUnit + 0 : placeDegrees(first, 'longitude');
  const y = isPlane ? second / kmPerUnit + 0 : placeDegrees(second, 'latitude');
  if (Number.isNaN(x) || Number.isNaN(y)) {
    reject(found, 'Longitude lies between -180 and 360 degrees and latitude between -90 and 90, in this order. Correct it, or map projected coordinates as x and y.');
    return;
  }
  const numbers = new Float64Array(NUMBER_FIELDS.length).fill(NaN);
  const labels = LABEL_FIELDS.map(() => '');
  if (readProperties(properties, line, mapping, numbers, labels, rows)) rows.accept(line, x, y, numbers, labels);
};

const readProperties = (
  properties: Json,
  line: number,
  mapping: Mapping,
  numbers: Float64Array,
  labels: string[],
  rows: ObservationRows,
): boolean => {
  for (const [k, field] of NUMBER_FIELDS.entries()) {
    const name = mapping[field];
    if (name === undefined) continue;
    const value = own(properties, String(name));
    const text = textOf(value).trim();
    if (text === '') continue;
    const isScalar = typeof value === 'number' || typeof value === 'string';
    numbers[k] = !isScalar ? NaN : field === 'time' ? parseTime(text) : parseNumber(text);
    const reason = Number.isNaN(numbers[k])
      ? field === 'time'
        ? explainTime(text)
        : explainNumber(text, false)
      : field === 'errorSd' && numbers[k] <= 0
        ? NOT_POSITIVE
        : null;
    if (reason === null) continue;
    rows.reject(line, String(name), text, reason);
    return false;
  }
  for (const [k, field] of LABEL_FIELDS.entries()) {
    const name = mapping[field];
    if (name === undefined) continue;
    const value = own(properties, String(name));
    labels[k] = tidyLabel(textOf(value).trim());
    const reason = typeof value === 'object' && value !== null ? 'A label is text or a number. Give one.' : explainLabel(labels[k]);
    if (reason === null) continue;
    rows.reject(line, String(name), labels[k], reason);
    return false;
  }
  return true;
};
