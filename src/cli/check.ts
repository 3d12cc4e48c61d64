import { z } from 'zod/v4';

import { checkMesh } from '#core/findings/check.ts';
import { correlationSchema } from '#schemas/correlation.ts';
import { parseValue } from '#server/respond.ts';

import { type Flags, numberFlag, readJson, required, UsageError } from './flags.ts';
import { readMeshDocument } from './mesh-document.ts';
import { createStopwatch } from './stopwatch.ts';

const limit = z.number().nullable();
const policySchema = z.record(z.string(), z.strictObject({ warn: limit, fail: limit }));
const mapSchema = z.array(z.int().min(0));

const present = (value: Record<string, unknown>): Record<string, unknown> => Object.fromEntries(Object.entries(value).filter(([, one]) => one !== undefined));

const run = async (flags: Flags): Promise<unknown> => {
  const watch = createStopwatch();
  watch.enter('read');
  const radiusKm = numberFlag(flags, 'radius-km') ?? 6371;
  const accuracy = numberFlag(flags, 'accuracy') ?? 1e-8;
  if (!(accuracy > 0 && accuracy < 1)) throw new UsageError(`--accuracy takes a relative accuracy between 0 and 1; ${accuracy} was given.`);
  const model = parseValue(
    correlationSchema,
    present({
      kind: flags.kind ?? 'scalar',
      daleyKm: numberFlag(flags, 'daley-km'),
      scaleKm: numberFlag(flags, 'scale-km') ?? numberFlag(flags, 'l-km'),
      steps: Number(required(flags, 'steps')),
      mass: flags.mass,
      normalisation: flags.normalisation,
      tolerance: numberFlag(flags, 'tolerance'),
      rotationalShare: numberFlag(flags, 'rotational-share'),
      sphereRadiusKm: radiusKm,
    }),
  );
  const mesh = readMeshDocument(await readJson('mesh', required(flags, 'mesh')), radiusKm);
  const policy = flags.policy === undefined ? undefined : parseValue(policySchema, await readJson('policy', flags.policy));
  if (flags.map !== undefined) mesh.observationNode = Uint32Array.from(parseValue(mapSchema, await readJson('map', flags.map)));
  const { findings, figures } = checkMesh({ mesh, model, policy, rowsSelected: mesh.observationNode?.length ?? 0, onPhase: watch.enter });
  const { nodes, elements, areaKm2, matrices } = figures;
  return {
    nodes,
    elements,
    area: areaKm2,
    matrices,
    findings: findings.map(({ id, value, unit, limit: { warn, fail }, verdict, placeCount, place }) => ({ id, value, unit, warn, fail, verdict, placeCount, place })),
    figures,
    timings: watch.finish(),
  };
};

/** `selvage check`: a mesh document judged against a correlation model. */
export const checkCommand = {
  flags: ['mesh', 'daley-km', 'scale-km', 'l-km', 'steps', 'kind', 'rotational-share', 'mass', 'normalisation', 'tolerance', 'radius-km', 'accuracy', 'policy', 'map'],
  run,
} as const;
