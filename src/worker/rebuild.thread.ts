/**
 * A program of its own: standard input gives a length (u32, little-endian), that many bytes of JSON with mapping,
 * recipe and sphere radius, then the original file; standard output gets the hash of the mesh that they make.
 */
import { createHash } from 'node:crypto';

import type { Recipe } from '#core/design/recipe.ts';
import { runRecipe } from '#core/design/run-recipe.ts';
import { readCsvObservations } from '#core/formats/csv-observations.ts';
import { detectFormat } from '#core/formats/detect-format.ts';
import { readGeoJsonObservations } from '#core/formats/geojson-observations.ts';
import type { Mapping } from '#core/formats/mapping.ts';
import { meshBytes } from '#core/geometry/mesh-bytes.ts';

interface RebuildRequest {
  mapping: Mapping;
  recipe: Recipe;
  sphereRadiusKm: number;
}

const parts: Buffer[] = [];
for await (const part of process.stdin) parts.push(part as Buffer);
const input = Buffer.concat(parts);
const headerLength = input.readUInt32LE(0);
const { mapping, recipe, sphereRadiusKm } = JSON.parse(input.subarray(4, 4 + headerLength).toString()) as RebuildRequest;
const bytes = new Uint8Array(input.subarray(4 + headerLength));

const { columns } = detectFormat(bytes.subarray(0, 65_536)) === 'csv' ? await readCsvObservations([bytes], mapping) : await readGeoJsonObservations(bytes, mapping);
const { mesh } = runRecipe(columns, recipe, { sphereRadiusKm });
const sha256 = (data: Uint8Array): string => createHash('sha256').update(data).digest('hex');
process.stdout.write(JSON.stringify({ meshHash: sha256(meshBytes(mesh)), observationSha256: sha256(bytes) }));
