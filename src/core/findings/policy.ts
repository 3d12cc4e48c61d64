import type { CorrelationModel } from '#core/correlation/model.ts';
import { NumericalError } from '#core/errors.ts';
import type { FindingPolicy } from './finding.ts';

/** Ids of all findings, in the order in which a check reports them. */
export const FINDING_IDS = [
  'orientation', 'edge-sharing', 'euler-characteristic', 'boundary-loops', 'orphan-nodes', 'duplicate-nodes', 'observations-on-nodes',
  'smallest-angle', 'positive-off-diagonals', 'positive-off-diagonals-at-observations', 'hull-slivers', 'size-ratio',
  'resolution-p95', 'resolution-largest',
  'mass-symmetry', 'stiffness-symmetry', 'stiffness-row-sums', 'mass-total', 'positive-diagonals',
  'boundary-effect', 'boundary-effect-other', 'buffer',
] as const;
export type FindingId = (typeof FINDING_IDS)[number];

/** Limits on h/D (h/l for 2 steps): accuracy of correlations of about 1 % (10 % two components) and 5 % (20 %). */
function resolutionLimit(model: CorrelationModel): { warn: number; fail: number } {
  if (model.kind === 'vector') return { warn: 0.1, fail: 0.2 };
  return model.steps === 2 ? { warn: 0.19, fail: 0.67 } : { warn: 0.25, fail: 0.64 };
}

/** The limits to start from for a model, by finding id; percentages in %, `buffer` in km is filled in by the check. */
export function defaultPolicy(model: CorrelationModel): Record<FindingId, { warn: number | null; fail: number | null }> {
  const none = { warn: null, fail: 0 };
  const percent = 100 * model.tolerance;
  return {
    orientation: none,
    'edge-sharing': none,
    'euler-characteristic': none,
    'boundary-loops': none,
    'orphan-nodes': none,
    'duplicate-nodes': none,
    'observations-on-nodes': none,
    'smallest-angle': { warn: 1, fail: 0.1 },
    'positive-off-diagonals': { warn: 0, fail: null },
    'positive-off-diagonals-at-observations': { warn: null, fail: 0 },
    'hull-slivers': { warn: 0, fail: null },
    'size-ratio': { warn: 1.5, fail: 2.5 },
    'resolution-p95': resolutionLimit(model),
    'resolution-largest': resolutionLimit(model),
    'mass-symmetry': { warn: 1e-14, fail: 1e-12 },
    'stiffness-symmetry': { warn: 1e-14, fail: 1e-12 },
    'stiffness-row-sums': { warn: 1e-12, fail: 1e-9 },
    'mass-total': { warn: 1e-12, fail: 1e-9 },
    'positive-diagonals': none,
    'boundary-effect': { warn: percent / 2, fail: percent },
    'boundary-effect-other': { warn: null, fail: null },
    buffer: { warn: null, fail: null },
  };
}

/** The defaults with a team's own limits on top. Throws RECIPE_INVALID for an id that no finding has. */
export function mergePolicy(model: CorrelationModel, policy: FindingPolicy = {}): Record<FindingId, { warn: number | null; fail: number | null }> {
  const merged = defaultPolicy(model);
  for (const [id, limit] of Object.entries(policy)) {
    if (!(id in merged))
      throw new NumericalError('RECIPE_INVALID', `The policy has a limit for "${id}", which is no finding. Known: ${FINDING_IDS.join(', ')}.`, { details: { field: id } });
    merged[id as FindingId] = limit;
  }
  return merged;
}
