import { createHash } from 'node:crypto';

import { zipSync } from 'fflate';

import { assembleMatrices } from '#core/fem/assembly.ts';
import { writeMeshGeoJson } from '#core/formats/geojson-mesh.ts';
import { writeDiagonalMarket, writeMatrixMarket } from '#core/formats/matrix-market.ts';
import { unpackMesh } from '#core/formats/mesh-bundle.ts';
import { writeUgrid } from '#core/formats/ugrid.ts';
import { CAUTION, type ExportFormat } from '#schemas/versions.ts';

import type { ThreadTools } from '../numerics.thread.ts';

/** What exports say of their version. */
export interface ExportFacts {
  meshHash: string;
  number: number;
  designName: string;
  /** ISO 8601. */
  savedAt: string;
  softwareVersion: string;
  observationSha256: string;
  recipe: unknown;
  correlation: unknown;
}

export interface ExportCall {
  kind: 'make-exports';
  /** `packMesh` of the version. */
  arrays: Uint8Array;
  facts: ExportFacts;
}

export interface MadeExport {
  format: ExportFormat;
  fileName: string;
  mediaType: string;
  sha256: string;
  bytes: Uint8Array;
}

export interface ExportAnswer {
  exports: MadeExport[];
}

/** Archives hold this time, in the local zone that ZIP counts in, so that their bytes are the same every time. */
const ZIP_TIME = new Date(1980, 0, 1);

const baseName = (facts: ExportFacts): string => {
  const words = facts.designName.toLowerCase().normalize('NFKD').replace(/[^a-z0-9]+/g, '-').replace(/^-+|-+$/g, '').slice(0, 60);
  return `${words || 'mesh'}-v${facts.number}`;
};

/** Every export of a version: the same bytes for the same version. Plane meshes have no GeoJSON. */
export const makeExports = ({ arrays, facts }: ExportCall, tools: ThreadTools): ExportAnswer => {
  const { mesh, selected } = unpackMesh(arrays);
  tools.report(0.1, 'assembling matrices');
  const { mass, lumpedMass, stiffness } = assembleMatrices(mesh);
  const name = baseName(facts);
  const exports: MadeExport[] = [];
  const add = (format: ExportFormat, fileName: string, mediaType: string, bytes: Uint8Array): void => {
    exports.push({ format, fileName, mediaType, sha256: createHash('sha256').update(bytes).digest('hex'), bytes });
  };

  tools.report(0.3, 'writing NetCDF');
  const title = `${facts.designName}, version ${facts.number}`;
  add('netcdf', `${name}.nc`, 'application/netcdf', writeUgrid(mesh, selected, lumpedMass, {
    title,
    source: facts.softwareVersion,
    history: `${facts.savedAt}: saved as version ${facts.number}`,
    meshSha256: facts.meshHash,
    observationSha256: facts.observationSha256,
    recipe: JSON.stringify(facts.recipe),
    correlation: JSON.stringify(facts.correlation),
    caution: CAUTION,
  }));

  tools.report(0.5, 'writing Matrix Market');
  const lines = (what: string): string[] => [what, `${title}; mesh SHA-256 ${facts.meshHash}`, 'Indices count from 1: row i is node i - 1 of the mesh.', CAUTION];
  const files = {
    'mass.mtx': writeMatrixMarket(mass, lines('Consistent mass matrix M, km2')),
    'lumped-mass.mtx': writeDiagonalMarket(lumpedMass, lines('Lumped mass matrix, the row sums of M, km2')),
    'stiffness.mtx': writeMatrixMarket(stiffness, lines('Stiffness matrix K, dimensionless')),
  };
  add('matrix-market', `${name}-matrices.zip`, 'application/zip', zipSync(files, { level: 6, mtime: ZIP_TIME }));

  if (mesh.crs === 'lonlat-deg') {
    tools.report(0.8, 'writing GeoJSON');
    add('geojson', `${name}.geojson`, 'application/geo+json', writeMeshGeoJson(mesh, { title, meshSha256: facts.meshHash, indexBase: 0, caution: CAUTION }));
  }
  return { exports };
};
