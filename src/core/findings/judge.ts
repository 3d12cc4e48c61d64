import type { Finding, FindingLimit, FindingPlace, Verdict } from './finding.ts';
import type { FindingId } from './policy.ts';

/** "show me" lists at most this many places. */
export const MOST_PLACES = 200;

/** pass, warn or fail; 'not-judged' for no value or no limit. */
export function judge(value: number | null, limit: FindingLimit): Verdict {
  if (value === null || (limit.warn === null && limit.fail === null)) return 'not-judged';
  const breaches = (bound: number | null) => bound !== null && (limit.direction === 'above' ? value > bound : value < bound);
  if (breaches(limit.fail)) return 'fail';
  return breaches(limit.warn) ? 'warn' : 'pass';
}

/** A finding without its limit and verdict. */
export type Measured = Omit<Finding, 'limit' | 'verdict' | 'id'> & { id: FindingId; direction?: FindingLimit['direction'] };

export type Limits = Record<FindingId, { warn: number | null; fail: number | null }>;

/** Gives a measured figure its limit, from the policy, and its verdict. */
export function withVerdict({ direction = 'above', ...measured }: Measured, limits: Limits): Finding {
  const limit: FindingLimit = { direction, ...limits[measured.id] };
  return { ...measured, limit, verdict: judge(measured.value, limit) };
}

/** The first MOST_PLACES of a list as a place, with the list's whole length. */
export function placesOf(kind: keyof FindingPlace, indices: ArrayLike<number>): { place: FindingPlace; placeCount: number } {
  const shown = Array.from({ length: Math.min(MOST_PLACES, indices.length) }, (_, k) => indices[k]);
  return { place: indices.length === 0 ? {} : { [kind]: shown }, placeCount: indices.length };
}

/** Indices whose value lies beyond `bound`, worst first; where none does, the single worst. */
export function worstBeyond(values: ArrayLike<number>, indices: ArrayLike<number>, bound: number | null, direction: FindingLimit['direction']): number[] {
  const sign = direction === 'above' ? 1 : -1;
  const beyond: number[] = [];
  let worst = -1;
  for (let k = 0; k < indices.length; k++) {
    if (bound !== null && sign * values[k] > sign * bound) beyond.push(k);
    if (worst < 0 || sign * values[k] > sign * values[worst]) worst = k;
  }
  if (beyond.length === 0) return worst < 0 ? [] : [indices[worst]];
  return beyond.sort((a, b) => sign * (values[b] - values[a]) || a - b).map((k) => indices[k]);
}

/** The q-quantile, 0 <= q <= 1, by the nearest rank; null for no values. */
export function quantile(values: ArrayLike<number>, q: number): number | null {
  if (values.length === 0) return null;
  const sorted = Float64Array.from(values).sort();
  return sorted[Math.min(sorted.length - 1, Math.max(0, Math.ceil(q * sorted.length) - 1))];
}
