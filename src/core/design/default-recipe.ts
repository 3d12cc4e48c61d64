import { bufferForTolerance } from '#core/correlation/boundary-effect.ts';
import type { CorrelationModel } from '#core/correlation/model.ts';
import { resolveScale } from '#core/correlation/scale.ts';

import { derivedCoreSpacing, localSpacing } from './local-spacing.ts';
import type { ObservationColumns } from './observations.ts';
import type { Recipe } from './recipe.ts';
import { selectObservations } from './select-observations.ts';

/** Change of direction at the sharpest corner that a hull of scattered points is likely to have: 120 degrees. */
const SHARP_CORNER = (2 * Math.PI) / 3;

/** The starting policy warns at half the tolerance; a start should not begin with a warning. */
const SHARE_OF_TOLERANCE = 0.5;

/** Element length over Daley length that keeps the largest error below 1 % (one component) or 10 % (two components). */
const RESOLUTION = { scalar: 0.2, vector: 0.09 };

/** A finer core than the observations' own spacing is proposed only while it costs no more nodes than this. */
const MOST_CORE_NODES = 40_000;

/** Observations closer than this share of the core spacing are one place for a mesh of that spacing. */
const NEAR_SHARE = 0.01;

/**
 * A recipe to start from: near observations combined, convex outline, round corners, growth 1.2, a buffer that keeps
 * the boundary effect below half the tolerance at a sharp corner, and a core spacing where the observations' own is
 * too coarse for the model. Distances are round figures.
 * @throws NumericalError SELECTION_EMPTY for a set without rows.
 */
export const defaultRecipe = (columns: ObservationColumns, model: CorrelationModel): Recipe => {
  const { sphereRadiusKm } = model;
  const selected = selectObservations(columns, { near: { km: 0, rule: 'combine' } }, { sphereRadiusKm });
  const { spacingKm, cellAreaKm2 } = localSpacing(selected, sphereRadiusKm);
  const recipe: Recipe = {
    selection: { near: { km: 0, rule: 'combine' } },
    outline: { kind: 'convex' },
    bufferKm: roundFigure(bufferForTolerance({ ...model, tolerance: model.tolerance * SHARE_OF_TOLERANCE }, SHARP_CORNER), 'up'),
    corners: 'round',
    growth: 1.2,
  };
  // a single place has no spacing
  if (!spacingKm.some((s) => s > 0)) return recipe;

  const { scaleKm, daleyKm } = resolveScale(model);
  const derivedKm = derivedCoreSpacing(spacingKm);
  const neededKm = RESOLUTION[model.kind] * (daleyKm || scaleKm);
  const areaKm2 = cellAreaKm2.reduce((sum, area) => sum + area, 0);
  const isFiner = neededKm < derivedKm && areaKm2 / (neededKm * neededKm) <= MOST_CORE_NODES;
  if (isFiner) recipe.coreSpacingKm = roundFigure(neededKm, 'down');
  recipe.selection.near.km = roundFigure(NEAR_SHARE * Math.min(derivedKm, neededKm), 'down');
  return recipe;
};

/** The nearest number of two significant digits at or above, or at or below, a positive one. */
const roundFigure = (value: number, direction: 'up' | 'down'): number => {
  let exponent = 0;
  while (value / Number(`1e${exponent}`) >= 100) exponent++;
  while (value / Number(`1e${exponent}`) < 10) exponent--;
  const digits = value / Number(`1e${exponent}`);
  return Number(`${direction === 'up' ? Math.ceil(digits) : Math.floor(digits)}e${exponent}`);
};
