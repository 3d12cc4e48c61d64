import { randomUUID } from 'node:crypto';

import { QueryTypes } from 'sequelize';

import type { Recipe } from '#core/design/recipe.ts';
import { ExportFile } from '#db/models/ExportFile.ts';
import { MeshVersion } from '#db/models/MeshVersion.ts';
import { MeshVersionState } from '#db/models/MeshVersionState.ts';
import { ObservationSetRow } from '#db/models/ObservationSetRow.ts';
import { StoredFile } from '#db/models/StoredFile.ts';
import type { Correlation } from '#schemas/correlation.ts';
import type { Finding } from '#schemas/findings.ts';
import { getDatabase, inTransaction } from '#server/database.ts';
import { AppError } from '#server/errors.ts';
import { SOFTWARE_VERSION } from '#server/software-version.ts';

import type { ExportAnswer } from '../numerics/make-exports.ts';
import type { Task } from '../task.ts';
import { runInThread } from '../threads.ts';
import { computeCheck } from './check-design.ts';

interface Payload {
  designId: string;
  designName: string;
  studyId: string;
  observationSetId: string;
  recipe: Recipe;
  correlation: Correlation;
  note: string;
  reason: string | null;
  userName: string;
}

const verdictOf = (findings: Finding[]): 'pass' | 'warn' | 'fail' => {
  if (findings.some((finding) => finding.verdict === 'fail')) return 'fail';
  return findings.some((finding) => finding.verdict === 'warn') ? 'warn' : 'pass';
};

const buffer = (bytes: Uint8Array): Buffer => Buffer.from(bytes.buffer, bytes.byteOffset, bytes.byteLength);

/**
 * Rebuilds and checks a design and keeps it as the study's next version with its exports. Refused while a finding
 * fails, unless a reason was given, which becomes the waiver. Run twice, it gives the version that the first run made.
 */
export const saveVersionTask: Task = async (payload, context) => {
  const { designId, designName, studyId, observationSetId, recipe, correlation, note, reason, userName } = payload as unknown as Payload;
  const { jobId, teamId, userId, signal, reportProgress } = context;
  const done = await MeshVersion.findOne({ where: { jobId }, attributes: ['id'] });
  if (done) return { versionId: done.id };
  const answer = await computeCheck(observationSetId, recipe, correlation, { ...context, reportProgress: (fraction, phase) => reportProgress(0.6 * fraction, phase) });
  const verdict = verdictOf(answer.findings);
  if (verdict === 'fail' && !reason) {
    const failing = answer.findings.filter((finding) => finding.verdict === 'fail');
    throw new AppError('FINDINGS_FAIL', `${failing.map((f) => f.title).join(', ')}: ${failing.length === 1 ? 'this finding fails' : 'these findings fail'}. Change the design, or save again with the reason why it is acceptable.`, {
      details: { findings: failing.map((f) => f.id) },
    });
  }
  const set = await ObservationSetRow.findByPk(observationSetId, { attributes: ['fileId'] });
  const file = set && (await StoredFile.findByPk(set.fileId));
  if (!file) throw new AppError('NOT_FOUND', 'The observation set is gone, so the version was not saved.');
  const savedAt = new Date();
  const versionId = randomUUID();
  return inTransaction(async (transaction) => {
    // versions of one study are numbered one after the other; designs and uploads of the study need not wait
    await getDatabase().query('SELECT id FROM studies WHERE id = :studyId FOR NO KEY UPDATE', { replacements: { studyId }, transaction });
    const [{ next }] = await getDatabase().query<{ next: number }>('SELECT coalesce(max(number), 0) + 1 AS next FROM mesh_versions WHERE study_id = :studyId', {
      replacements: { studyId },
      transaction,
      type: QueryTypes.SELECT,
    });
    const { exports } = await runInThread<ExportAnswer>(
      {
        kind: 'make-exports',
        arrays: answer.arrays,
        facts: { meshHash: answer.meshHash, number: next, designName, savedAt: savedAt.toISOString(), softwareVersion: SOFTWARE_VERSION, observationSha256: file.sha256, recipe, correlation },
      },
      { signal, onProgress: (fraction, phase) => reportProgress(0.6 + 0.3 * fraction, phase) },
    );
    reportProgress(0.95, 'writing the version');
    await MeshVersion.create(
      {
        id: versionId,
        teamId,
        studyId,
        designId,
        designName,
        observationSetId,
        observationSha256: file.sha256,
        number: next,
        recipe,
        correlation,
        findings: answer.findings,
        figures: answer.figures,
        verdict,
        waiver: verdict === 'fail' ? reason : null,
        note,
        nodes: answer.nodes,
        elements: answer.elements,
        meshHash: answer.meshHash,
        arrays: buffer(answer.arrays),
        softwareVersion: SOFTWARE_VERSION,
        jobId,
        savedBy: userId,
        savedByName: userName,
        savedAt,
      },
      { transaction },
    );
    await MeshVersionState.create({ versionId, teamId, state: 'saved' }, { transaction });
    for (const { bytes, ...facts } of exports) await ExportFile.create({ ...facts, versionId, teamId, bytes: buffer(bytes) }, { transaction });
    signal.throwIfAborted();
    return { versionId, number: next, meshHash: answer.meshHash };
  });
};
