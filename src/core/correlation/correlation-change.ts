/**
 * The correlation change at an observation: the largest absolute change |c_bounded - c| of the correlation, normalised
 * by the exact diagonal, between it and a partner anywhere that is no nearer to the boundary. Exact for a straight
 * side, by images; the largest is found along the side or straight inwards (searching the half plane finds no larger).
 */
import { maternCorrelation } from './matern.ts';

const PARTNER_STEP = 0.25;
const DISTANCE_STEP = 0.1;
const tables = new Map<number, { excess: Float64Array; change: Float64Array }>();

/** Largest correlation change for a straight side at distance d (scales), m steps. */
export function straightCorrelationChange(m: number, d: number): number {
  const here = 1 + maternCorrelation(m, 2 * d);
  const farthest = 2 * d + 4 * Math.sqrt(m) + 4;
  const along = (r: number) => {
    const free = maternCorrelation(m, r);
    return Math.abs((free + maternCorrelation(m, Math.sqrt(r * r + 4 * d * d))) / here - free);
  };
  const inwards = (r: number) => {
    const free = maternCorrelation(m, r);
    const there = 1 + maternCorrelation(m, 2 * (d + r));
    return Math.abs((free + maternCorrelation(m, 2 * d + r)) / Math.sqrt(here * there) - free);
  };
  return Math.max(largest(along, farthest), largest(inwards, farthest));
}

/** Largest value of f on (0, end]: a scan, then a parabola through the best three. */
function largest(f: (r: number) => number, end: number): number {
  let best = 0;
  let at = PARTNER_STEP;
  for (let r = PARTNER_STEP; r <= end; r += PARTNER_STEP) {
    const value = f(r);
    if (value > best) {
      best = value;
      at = r;
    }
  }
  const left = f(Math.max(1e-6, at - PARTNER_STEP));
  const right = f(at + PARTNER_STEP);
  const bend = left - 2 * best + right;
  return bend < 0 ? best - (right - left) ** 2 / (8 * bend) : best;
}

/**
 * The correlation change that goes with a variance excess (0 or more): that of the straight side with the same excess.
 * Exact for a straight side. Elsewhere an estimate, mostly on the safe side: against finite elements it is up to 3
 * times too large at the corners and in small discs (partners deeper inside are fewer there than in a half plane), and
 * too small by up to a half between parallel sides at 1 D, a fifth at 1.5 D, and by 0.3 at 1.3-buffer discs, m = 10.
 */
export function correlationChangeOf(m: number, excess: number): number {
  const { excess: known, change } = changeTable(m);
  if (excess <= 0) return 0;
  const last = known.length - 1;
  if (excess >= known[0]) return change[0];
  if (excess <= known[last]) return (change[last] * excess) / known[last];
  let low = 0;
  let high = last;
  while (high - low > 1) {
    const middle = (low + high) >> 1;
    if (known[middle] >= excess) low = middle;
    else high = middle;
  }
  const t = Math.log(known[low] / excess) / Math.log(known[low] / known[high]);
  return change[low] + (change[high] - change[low]) * t;
}

function changeTable(m: number): { excess: Float64Array; change: Float64Array } {
  const known = tables.get(m);
  if (known) return known;
  const excess: number[] = [];
  const change: number[] = [];
  for (let d = 0; excess.length === 0 || excess[excess.length - 1] > 1e-8; d += DISTANCE_STEP) {
    excess.push(maternCorrelation(m, 2 * d));
    change.push(straightCorrelationChange(m, d));
  }
  const table = { excess: Float64Array.from(excess), change: Float64Array.from(change) };
  tables.set(m, table);
  return table;
}
