import { readdirSync, readFileSync } from 'node:fs';
import path from 'node:path';

import { describe, expect, it } from 'vitest';

import { openApiDocument } from '#server/openapi/document.ts';
import { ROUTES } from '#server/openapi/routes.ts';

const FOLDER = path.resolve(import.meta.dirname, '../../../../src/pages/api/v1');

/** Methods that the endpoint files export, as `GET /studies/{studyId}`. */
const endpoints = (): string[] =>
  readdirSync(FOLDER, { recursive: true, encoding: 'utf8' })
    .filter((file) => file.endsWith('.ts'))
    .flatMap((file) => {
      const address = `/${file.replace(/\.ts$/, '').replace(/(^|\/)index$/, '').replaceAll(/\[(\w+)\]/g, '{$1}')}`;
      const source = readFileSync(path.join(FOLDER, file), 'utf8');
      return [...source.matchAll(/^export const ([A-Z]+)\b/gm)].map(([, method]) => `${method} ${address}`);
    });

interface Operation {
  operationId: string;
  parameters?: { name: string; in: string; required: boolean; schema: Record<string, unknown> }[];
  requestBody?: { content: Record<string, { schema: Record<string, unknown> }> };
  responses: Record<string, { content?: Record<string, unknown> }>;
  security?: unknown[];
}

describe('the OpenAPI document', () => {
  const document = openApiDocument() as { openapi: string; paths: Record<string, Record<string, Operation>>; components: { schemas: Record<string, Record<string, any>> } };
  const operations = Object.entries(document.paths).flatMap(([address, methods]) => Object.entries(methods).map(([method, operation]) => ({ name: `${method.toUpperCase()} ${address}`, address, operation })));

  it('has every endpoint file’s methods, and no other', () => {
    const found = endpoints().sort();
    expect(found.length).toBeGreaterThan(30);
    expect(operations.map(({ name }) => name).sort()).toEqual(found);
    expect(ROUTES).toHaveLength(found.length);
  });

  // OpenAPI 3.1.1, 4.8.2, 4.8.9 and 4.8.10: path parameters all declared, operation ids unique, every operation with responses
  it('declares the parameters of each path, unique operation ids and an answer', () => {
    expect(document.openapi).toMatch(/^3\.1\./);
    const ids = operations.map(({ operation }) => operation.operationId);
    expect(new Set(ids).size).toBe(ids.length);
    for (const { name, address, operation } of operations) {
      const inPath = (operation.parameters ?? []).filter((parameter) => parameter.in === 'path');
      expect(inPath.map((parameter) => `{${parameter.name}}`), name).toEqual(address.match(/\{\w+\}/g) ?? []);
      expect(inPath.every((parameter) => parameter.required), name).toBe(true);
      expect(Object.keys(operation.responses).some((status) => /^20\d$/.test(status)), name).toBe(true);
      expect(operation.responses['204']?.content, name).toBeUndefined();
    }
  });

  it('refers only to schemas that it has, and holds nothing else of another document', () => {
    const text = JSON.stringify(document);
    const referred = [...text.matchAll(/"\$ref":"([^"]+)"/g)].map(([, target]) => target);
    expect(referred.length).toBeGreaterThan(40);
    for (const target of referred) {
      expect(target).toMatch(/^#\/components\/schemas\//);
      expect(Object.keys(document.components.schemas)).toContain(target.split('/').at(-1));
    }
    expect(text).not.toContain('"$id"');
  });

  it('asks of clients only what has no default, and refuses what is unknown', () => {
    const { schemas } = document.components;
    expect(schemas['CorrelationInput'].required).toEqual(['kind', 'steps']);
    expect(schemas['Correlation'].required).toContain('tolerance');
    expect(schemas['CreateDesignBody'].required).toEqual(['name', 'observationSetId']);
    expect(schemas['CreateDesignBody'].properties.recipe).toEqual({ $ref: '#/components/schemas/RecipeInput' });
    expect(schemas['CreateDesignBody'].additionalProperties).toBe(false);
    expect(schemas['Design'].additionalProperties).toBeUndefined();
    const points = document.paths['/observation-sets/{setId}/points']['get'].parameters!;
    expect(points.filter((parameter) => parameter.in === 'query').every((parameter) => !parameter.required)).toBe(true);
  });

  it('tells the shape of the upload form', () => {
    const form = document.paths['/studies/{studyId}/observation-sets']['post'].requestBody!.content['multipart/form-data'].schema;
    expect(form['required']).toEqual(['file']);
  });

  it('asks for a session everywhere but where nobody need be signed in', () => {
    const open = operations.filter(({ operation }) => operation.security?.length === 0).map(({ name }) => name).sort();
    expect(open).toEqual(['DELETE /session', 'GET /openapi.json', 'POST /session']);
  });
});
