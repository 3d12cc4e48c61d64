import { NumericalError } from '#core/errors.ts';

import { combinedErrorSd, combineNear, memberWeights, refuseNear, thinNear } from './near-rule.ts';
import type { Candidates } from './near-rule.ts';
import type { LabelColumn, ObservationColumns } from './observations.ts';
import { observationCount } from './observations.ts';
import type { Selection } from './recipe.ts';
import { createRingRegion } from './ring-region.ts';
import type { SelectedObservations } from './designed-mesh.ts';
import { EXCLUSION } from './designed-mesh.ts';

/**
 * The observations of a design: rows kept by flag, time window, level and polygons (in this order; the first reason
 * counts), then the near-observation rule. Rows without a time or level fall out when a window is set for it.
 * Polygons: `createRingRegion`. Near observations: `combineNear`, `thinNear`, `refuseNear`. A combined observation
 * has the inverse-variance weighted mean of its rows' values and the standard deviation 1/sqrt(sum of 1/sd²); where a
 * row has no standard deviation the mean is unweighted and the result has none. Observations are ordered by their
 * first row; the same input gives the same bits on every machine.
 * @throws NumericalError SELECTION_EMPTY (with counts by reason), POINTS_TOO_CLOSE, POLYGON_INVALID, RECIPE_INVALID.
 */
export const selectObservations = (
  columns: ObservationColumns,
  selection: Selection,
  { sphereRadiusKm }: { sphereRadiusKm: number },
): SelectedObservations => {
  checkSelection(selection, sphereRadiusKm);
  const exclusion = excludeRows(columns, selection);
  const candidateRows = keptRows(exclusion);
  if (candidateRows.length === 0) throw emptySelection(columns, exclusion);

  const candidates: Candidates = {
    crs: columns.crs,
    sphereRadiusKm,
    x: gather(columns.x, candidateRows),
    y: gather(columns.y, candidateRows),
    errorSd: columns.errorSd && gather(columns.errorSd, candidateRows),
  };
  const { km, rule } = selection.near;
  if (rule === 'combine') return combineRows(columns, exclusion, candidateRows, candidates, km);
  if (rule === 'refuse') refuseNear(candidates, km, (i) => columns.line[candidateRows[i]]);
  if (rule === 'thin') {
    const kept = thinNear(candidates, km);
    for (let i = 0; i < kept.length; i++) if (!kept[i]) exclusion[candidateRows[i]] = EXCLUSION.thinned;
  }
  return pickRows(columns, exclusion, keptRows(exclusion));
};

/** The column's values at some rows. */
const gather = (column: Float64Array, rows: Uint32Array): Float64Array => {
  const out = new Float64Array(rows.length);
  for (let i = 0; i < rows.length; i++) out[i] = column[rows[i]];
  return out;
};

const checkSelection = ({ near, timeWindow, level }: Selection, sphereRadiusKm: number): void => {
  const refuse = (field: string, message: string): never => {
    throw new NumericalError('RECIPE_INVALID', message, { details: { field } });
  };
  if (!Number.isFinite(near.km) || near.km < 0)
    refuse('near.km', `Near observations need a distance of 0 km or more; ${near.km} was given.`);
  if (timeWindow && !(timeWindow.from <= timeWindow.to))
    refuse('timeWindow', 'The time window ends before it begins. Exchange its two ends.');
  if (level && !(level.min <= level.max))
    refuse('level', `The lowest level, ${level.min}, is above the highest, ${level.max}. Exchange the two.`);
  if (!(sphereRadiusKm > 0 && sphereRadiusKm < Infinity))
    refuse('sphereRadiusKm', `The sphere needs a positive radius in km; ${sphereRadiusKm} was given.`);
};

const excludeRows = (columns: ObservationColumns, selection: Selection): Uint8Array => {
  const { x, y, time, level } = columns;
  const { timeWindow, level: levels } = selection;
  const isFlagKept = createFlagTest(columns.flag, selection.flags);
  const isInKept = selection.keepInside && createRingRegion(selection.keepInside, columns.crs, 'keep inside');
  const isInLeftOut = selection.leaveOut && createRingRegion(selection.leaveOut, columns.crs, 'leave out');

  const reasonFor = (row: number): number => {
    if (!isFlagKept(row)) return EXCLUSION.flag;
    if (timeWindow && !(time && time[row] >= timeWindow.from && time[row] <= timeWindow.to)) return EXCLUSION.timeWindow;
    if (levels && !(level && level[row] >= levels.min && level[row] <= levels.max)) return EXCLUSION.level;
    if (isInKept && !isInKept(x[row], y[row])) return EXCLUSION.outsidePolygon;
    if (isInLeftOut && isInLeftOut(x[row], y[row])) return EXCLUSION.insidePolygon;
    return EXCLUSION.none;
  };
  const exclusion = new Uint8Array(observationCount(columns));
  for (let row = 0; row < exclusion.length; row++) exclusion[row] = reasonFor(row);
  return exclusion;
};

const createFlagTest = (flag: LabelColumn | undefined, kept: string[] | undefined): ((row: number) => boolean) => {
  if (!kept) return () => true;
  const names = new Set(kept);
  if (!flag) return () => names.has('');
  const isKept = flag.names.map((name) => names.has(name));
  return (row) => isKept[flag.codes[row]];
};

const keptRows = (exclusion: Uint8Array): Uint32Array => {
  const rows = new Uint32Array(exclusion.length);
  let count = 0;
  for (let row = 0; row < exclusion.length; row++) if (exclusion[row] === EXCLUSION.none) rows[count++] = row;
  return rows.slice(0, count);
};

const pickRows = (columns: ObservationColumns, exclusion: Uint8Array, rows: Uint32Array): SelectedObservations => {
  const rowStart = new Uint32Array(rows.length + 1);
  for (let i = 0; i <= rows.length; i++) rowStart[i] = i;
  return {
    crs: columns.crs,
    x: gather(columns.x, rows),
    y: gather(columns.y, rows),
    ...(columns.value && { value: gather(columns.value, rows) }),
    ...(columns.value2 && { value2: gather(columns.value2, rows) }),
    ...(columns.errorSd && { errorSd: gather(columns.errorSd, rows) }),
    rowStart,
    rows,
    exclusion,
  };
};

const combineRows = (
  columns: ObservationColumns,
  exclusion: Uint8Array,
  candidateRows: Uint32Array,
  candidates: Candidates,
  km: number,
): SelectedObservations => {
  const { start, members, x, y } = combineNear(candidates, km);
  if (x.length === candidateRows.length) return pickRows(columns, exclusion, candidateRows);

  const rows = new Uint32Array(members.length);
  for (let k = 0; k < rows.length; k++) rows[k] = candidateRows[members[k]];
  const out: SelectedObservations = { crs: columns.crs, x, y, rowStart: start, rows, exclusion };
  const { value, value2, errorSd } = columns;
  if (value) out.value = combineColumn(value, out, errorSd);
  if (value2) out.value2 = combineColumn(value2, out, errorSd);
  if (errorSd) out.errorSd = mapGroups(errorSd, out, (rows) => combinedErrorSd(rows, errorSd));
  return out;
};

/** The column at single rows, and what `combine` makes of a group's rows elsewhere. */
const mapGroups = (
  column: Float64Array,
  { rowStart, rows }: SelectedObservations,
  combine: (rows: Uint32Array) => number,
): Float64Array => {
  const out = new Float64Array(rowStart.length - 1);
  for (let g = 0; g < out.length; g++) {
    const start = rowStart[g];
    const end = rowStart[g + 1];
    out[g] = end - start === 1 ? column[rows[start]] : combine(rows.subarray(start, end));
  }
  return out;
};

/** Weighted mean of a column over the rows that give it; NaN where none does. */
const combineColumn = (column: Float64Array, selected: SelectedObservations, errorSd: Float64Array | undefined): Float64Array =>
  mapGroups(column, selected, (rows) => {
    const weights = memberWeights(rows, errorSd);
    let sum = 0;
    let total = 0;
    for (const [k, row] of rows.entries()) {
      if (Number.isNaN(column[row])) continue;
      sum += weights[k] * column[row];
      total += weights[k];
    }
    return total > 0 ? sum / total : NaN;
  });

const REASON_WORDS: [number, string, string][] = [
  [EXCLUSION.flag, 'flag', 'by their quality flag'],
  [EXCLUSION.timeWindow, 'timeWindow', 'by the time window'],
  [EXCLUSION.level, 'level', 'by the level'],
  [EXCLUSION.outsidePolygon, 'outsidePolygon', 'outside the polygon to keep'],
  [EXCLUSION.insidePolygon, 'insidePolygon', 'inside the polygon to leave out'],
];

const emptySelection = (columns: ObservationColumns, exclusion: Uint8Array): NumericalError => {
  if (exclusion.length === 0)
    return new NumericalError('SELECTION_EMPTY', 'The observation set has no rows. Upload a file that has some.', {
      details: { rows: 0 },
    });
  const counts: Record<string, number> = { rows: exclusion.length };
  const words: string[] = [];
  for (const [code, key, text] of REASON_WORDS) {
    const count = exclusion.reduce((sum, reason) => sum + (reason === code ? 1 : 0), 0);
    counts[key] = count;
    if (count === 0) continue;
    const isColumnMissing =
      (code === EXCLUSION.timeWindow && !columns.time) ||
      (code === EXCLUSION.level && !columns.level) ||
      (code === EXCLUSION.flag && !columns.flag);
    words.push(`${count} ${text}${isColumnMissing ? ' (the observation set has no such column)' : ''}`);
  }
  return new NumericalError(
    'SELECTION_EMPTY',
    `The selection leaves no observation of ${exclusion.length} rows: ${words.join(', ')}. Widen the selection.`,
    { details: counts },
  );
};
