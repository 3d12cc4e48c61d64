import { z } from 'zod/v4';

import { correlationSchema } from '#schemas/correlation.ts';
import { designSchema } from '#schemas/designs.ts';
import { checkFiguresSchema, checkResultSchema, findingSchema } from '#schemas/findings.ts';
import { jobSchema } from '#schemas/jobs.ts';
import { mappingSchema, observationPointSchema, observationSetSchema, rejectedRowSchema } from '#schemas/observation-sets.ts';
import { memberSchema, meSchema, teamSchema } from '#schemas/people.ts';
import { problemSchema } from '#schemas/problem.ts';
import { recipeSchema } from '#schemas/recipe.ts';
import { studySchema } from '#schemas/studies.ts';
import { exportSchema, versionSchema, versionSummarySchema } from '#schemas/versions.ts';

import manifest from '../../../package.json' with { type: 'json' };
import { SESSION_COOKIE } from '../auth/sessions.ts';
import { LEAST_ROLE } from '../policies.ts';
import { type Route, ROUTES } from './routes.ts';

type Json = Record<string, unknown>;

/** Shapes that have a name of their own in the document; elsewhere they are referred to. */
const NAMED: Record<string, z.ZodType> = {
  Problem: problemSchema,
  Me: meSchema,
  Team: teamSchema,
  Member: memberSchema,
  Correlation: correlationSchema,
  Study: studySchema,
  Mapping: mappingSchema,
  ObservationSet: observationSetSchema,
  ObservationPoint: observationPointSchema,
  RejectedRow: rejectedRowSchema,
  Recipe: recipeSchema,
  Design: designSchema,
  Finding: findingSchema,
  CheckFigures: checkFiguresSchema,
  CheckResult: checkResultSchema,
  Job: jobSchema,
  VersionSummary: versionSummarySchema,
  Version: versionSchema,
  Export: exportSchema,
};

/** What a client sends may leave out what has a default: the same shapes under names of their own. */
const SENT: Record<string, z.ZodType> = { CorrelationInput: correlationSchema, RecipeInput: recipeSchema, MappingInput: mappingSchema };

const refer = (id: string): string => `#/components/schemas/${id}`;

/** Says of a JSON schema what Zod leaves unsaid, and leaves out what it says without need. */
const tidy = (schema: Json): void => {
  if (schema['maximum'] === Number.MAX_SAFE_INTEGER) delete schema['maximum'];
  if (schema['minimum'] === Number.MIN_SAFE_INTEGER) delete schema['minimum'];
  const tuple = schema['prefixItems'];
  if (Array.isArray(tuple)) Object.assign(schema, { minItems: tuple.length, maxItems: tuple.length });
};

/** Converts schemas, each by name, with references between them; `io` tells whether clients send or receive them. */
const convert = (named: Record<string, z.ZodType>, io: 'input' | 'output'): Record<string, Json> => {
  const registry = z.registry<{ id: string }>();
  for (const [id, schema] of Object.entries(named)) registry.add(schema, { id });
  const override = ({ jsonSchema }: { jsonSchema: Json }): void => {
    tidy(jsonSchema);
    // answers may gain members
    if (io === 'output' && jsonSchema['additionalProperties'] === false) delete jsonSchema['additionalProperties'];
  };
  const { schemas } = z.toJSONSchema(registry, { io, uri: refer, override, unrepresentable: 'any' }) as unknown as { schemas: Record<string, Json> };
  for (const schema of Object.values(schemas)) {
    delete schema['$id'];
    delete schema['$schema'];
  }
  return schemas;
};

const capital = (word: string): string => word.charAt(0).toUpperCase() + word.slice(1);
const answerName = (route: Route): string => `${capital(route.operation)}Answer`;
const bodyName = (route: Route): string => `${capital(route.operation)}Body`;
const nameOf = (schema: z.ZodType, fallback: string): string => Object.keys(NAMED).find((name) => NAMED[name] === schema) ?? fallback;

const uploadBody = (): Json => ({
  type: 'object',
  required: ['file'],
  properties: {
    file: { type: 'string', contentMediaType: 'application/octet-stream', description: 'CSV (any common delimiter) or GeoJSON points.' },
    name: { type: 'string', maxLength: 120, description: 'Name of the observation set; absent: that of the file.' },
    mapping: { type: 'string', contentMediaType: 'application/json', contentSchema: { $ref: refer('MappingInput') }, description: 'Which column is what; absent: detected from the header.' },
  },
});

const parametersOf = ({ path, query }: Route): Json[] => {
  const inPath = [...path.matchAll(/\{(\w+)\}/g)].map(([, name]) => ({ name, in: 'path', required: true, schema: name === 'format' ? { type: 'string', enum: exportSchema.shape.format.options } : { type: 'string', format: 'uuid' } }));
  if (!query) return inPath;
  const { properties = {}, required = [] } = convert({ Query: query }, 'input')['Query'] as { properties?: Record<string, Json>; required?: string[] };
  return [...inPath, ...Object.entries(properties).map(([name, schema]) => ({ name, in: 'query', required: required.includes(name), schema }))];
};

const whoMay = ({ access }: Route): string => {
  if (access === 'everybody') return 'Needs no sign-in.';
  return access === 'signed-in' ? 'Needs a sign-in.' : `Needs the role ${LEAST_ROLE[access]} in the team.`;
};

const answerOf = (route: Route): Json => {
  const content: Json = {};
  if (route.answer) content['application/json'] = { schema: { $ref: refer(nameOf(route.answer, answerName(route))) } };
  for (const type of route.media ?? []) content[type] = {};
  const headers = route.status === 202 ? { Location: { description: 'Address of the job.', schema: { type: 'string' } } } : undefined;
  const description = { 200: 'Done.', 201: 'Made.', 202: 'Accepted: the job that does it.', 204: 'Done; nothing to say.' }[route.status];
  return { description, ...(headers && { headers }), ...(Object.keys(content).length > 0 && { content }) };
};

const operationOf = (route: Route): Json => {
  const parameters = parametersOf(route);
  const body = route.isUpload ? { 'multipart/form-data': { schema: uploadBody() } } : route.body && { 'application/json': { schema: { $ref: refer(bodyName(route)) } } };
  return {
    operationId: route.operation,
    summary: route.summary,
    description: whoMay(route),
    tags: [route.path.split('/')[1]],
    ...(route.access === 'everybody' && { security: [] }),
    ...(parameters.length > 0 && { parameters }),
    ...(body && { requestBody: { required: true, content: body } }),
    responses: {
      [route.status]: answerOf(route),
      default: { description: 'Problem details (RFC 9457) with a stable `code`.', content: { 'application/problem+json': { schema: { $ref: refer('Problem') } } } },
    },
  };
};

/** The OpenAPI 3.1 document of the whole interface, made from the routes and the schemas that the endpoints use. */
export const openApiDocument = (): Json => {
  const answers = Object.fromEntries(ROUTES.flatMap((route) => (route.answer && nameOf(route.answer, '') === '' ? [[answerName(route), route.answer]] : [])));
  const bodies = Object.fromEntries(ROUTES.flatMap((route) => (route.body ? [[bodyName(route), route.body]] : [])));
  const paths: Record<string, Json> = {};
  for (const route of ROUTES) (paths[route.path] ??= {})[route.method.toLowerCase()] = operationOf(route);
  return {
    openapi: '3.1.1',
    info: {
      title: 'Selvage',
      version: manifest.version,
      description: 'Everything that Selvage’s own pages do, for scripts and other programs. Lists are {items, nextCursor}; long work answers 202 with a job; distances are in km, longitudes and latitudes in degrees, indices count from 0.',
    },
    servers: [{ url: '/api/v1' }],
    security: [{ session: [] }],
    paths,
    components: {
      securitySchemes: { session: { type: 'apiKey', in: 'cookie', name: SESSION_COOKIE, description: 'Set by POST /session.' } },
      schemas: { ...convert({ ...NAMED, ...answers }, 'output'), ...convert({ ...SENT, ...bodies }, 'input') },
    },
  };
};
