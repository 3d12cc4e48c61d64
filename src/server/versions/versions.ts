import { ExportFile } from '#db/models/ExportFile.ts';
import { MeshVersion } from '#db/models/MeshVersion.ts';
import { MeshVersionState } from '#db/models/MeshVersionState.ts';
import type { Finding } from '#schemas/findings.ts';
import type { Job } from '#schemas/jobs.ts';
import type { List, ListQuery } from '#schemas/list.ts';
import { CAUTION, type ExportEntry, type ExportFormat, exportFormatSchema, type Version, type VersionSummary } from '#schemas/versions.ts';

import type { Context } from '../context.ts';
import { getDatabase, inTransaction } from '../database.ts';
import { notFound } from '../errors.ts';
import { enqueueJob } from '../jobs/jobs.ts';
import { afterCursor, pageOf, requireId } from '../pages-of-lists.ts';
import { type Action, authorize } from '../policies.ts';
import { loadStudy } from '../studies/studies.ts';

const SUMMARY = { exclude: ['arrays', 'findings', 'figures'] };

/** What each export is, in a sentence for people. */
const DESCRIPTIONS: Record<ExportFormat, string> = {
  netcdf: 'NetCDF with UGRID 1.0 topology and CF 1.11 attributes: nodes, elements, boundary, observation indices, lumped mass.',
  'matrix-market': 'Consistent mass, lumped mass and stiffness matrix as Matrix Market files in one archive.',
  geojson: 'Nodes, elements, outline and boundary as GeoJSON (RFC 7946).',
};

const presentSummary = (row: MeshVersion, state: VersionSummary['state']): VersionSummary => ({
  id: row.id,
  studyId: row.studyId,
  number: row.number,
  state,
  designName: row.designName,
  observationSetId: row.observationSetId,
  meshHash: row.meshHash,
  nodes: row.nodes,
  elements: row.elements,
  verdict: row.verdict,
  note: row.note,
  savedBy: { id: row.savedBy ?? '', name: row.savedByName },
  savedAt: row.savedAt.toISOString(),
});

const loadVersion = async (ctx: Context, versionId: string | undefined, action: Action, attributes: object = { exclude: ['arrays'] }): Promise<MeshVersion> => {
  const id = requireId(versionId, 'version');
  getDatabase();
  const row = await MeshVersion.findByPk(id, { attributes: attributes as never });
  authorize(ctx, action, row?.teamId ?? '', 'version');
  if (!row) throw notFound('version');
  return row;
};

/** Versions of a study, newest first. */
export const listVersions = async (ctx: Context, studyId: string | undefined, query: ListQuery): Promise<List<VersionSummary>> => {
  const study = await loadStudy(ctx, studyId, 'version.read');
  const rows = await MeshVersion.findAll({
    attributes: SUMMARY,
    where: { studyId: study.id, ...afterCursor(query.cursor, 'savedAt') },
    order: [['savedAt', 'DESC'], ['id', 'ASC']],
    limit: query.limit + 1,
  });
  const states = new Map((await MeshVersionState.findAll({ where: { versionId: rows.map((row) => row.id) } })).map((s) => [s.versionId, s.state]));
  return pageOf(rows, query.limit, (row) => row.savedAt, (row) => presentSummary(row, states.get(row.id) ?? 'saved'));
};

/** One version with recipe, findings and figures. */
export const getVersion = async (ctx: Context, versionId: string | undefined): Promise<Version> => {
  const row = await loadVersion(ctx, versionId, 'version.read');
  const state = await MeshVersionState.findByPk(row.id);
  return {
    ...presentSummary(row, state?.state ?? 'saved'),
    designId: row.designId,
    recipe: row.recipe,
    correlation: row.correlation,
    findings: row.findings,
    figures: row.figures,
    waiver: row.waiver,
    softwareVersion: row.softwareVersion,
    observationSha256: row.observationSha256,
    caution: CAUTION,
  };
};

/** The findings that a version was saved with. */
export const listFindings = async (ctx: Context, versionId: string | undefined): Promise<List<Finding>> => ({
  items: (await loadVersion(ctx, versionId, 'version.read')).findings,
  nextCursor: null,
});

/** Mesh and observations of a version (`core/formats/mesh-bundle`) and the mesh's hash. */
export const getMeshBundle = async (ctx: Context, versionId: string | undefined): Promise<{ bytes: Buffer; meshHash: string }> => {
  const row = await loadVersion(ctx, versionId, 'version.read', ['id', 'teamId', 'arrays', 'meshHash']);
  return { bytes: row.arrays, meshHash: row.meshHash };
};

/** Queues a rebuild from the original bytes, which changes nothing. */
export const startRebuild = async (ctx: Context, versionId: string | undefined): Promise<Job> => {
  const row = await loadVersion(ctx, versionId, 'version.read', ['id', 'teamId']);
  return inTransaction((transaction) => enqueueJob(ctx, { kind: 'rebuild-version', teamId: row.teamId, payload: { versionId: row.id }, transaction }));
};

/** The exports that a version has. */
export const listExports = async (ctx: Context, versionId: string | undefined): Promise<List<ExportEntry>> => {
  const row = await loadVersion(ctx, versionId, 'version.read', ['id', 'teamId']);
  const files = await ExportFile.findAll({ where: { versionId: row.id }, attributes: { exclude: ['bytes'] }, order: [['format', 'ASC']] });
  const order = Object.keys(DESCRIPTIONS);
  return {
    items: files
      .sort((a, b) => order.indexOf(a.format) - order.indexOf(b.format))
      .map(({ format, fileName, mediaType, sha256 }) => ({ format, fileName, mediaType, sha256, description: DESCRIPTIONS[format], url: `/api/v1/versions/${row.id}/exports/${format}` })),
    nextCursor: null,
  };
};

/** One export's bytes: the same ones every time. @throws AppError NOT_FOUND when the version has none of that format */
export const openExport = async (ctx: Context, versionId: string | undefined, format: string | undefined): Promise<ExportFile> => {
  const row = await loadVersion(ctx, versionId, 'version.read', ['id', 'teamId']);
  const wanted = exportFormatSchema.safeParse(format);
  const file = wanted.success ? await ExportFile.findOne({ where: { versionId: row.id, format: wanted.data } }) : null;
  if (!file) throw notFound('export of this version');
  return file;
};
