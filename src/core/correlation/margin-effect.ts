/**
 * The boundary effect as a function of the buffer, for the margin strip and for the recommended buffer.
 * Straight side: exact, by images. Rounded corner: c(2B) + turning/(2 pi) disc(B), within 0.04 percentage points of
 * finite elements at a 1 % buffer.
 */
import { NumericalError } from '#core/errors.ts';
import { cornerComponentExcess, largestComponent } from './component-excess.ts';
import { correlationChangeOf } from './correlation-change.ts';
import { discExcess } from './disc.ts';
import { maternCorrelation } from './matern.ts';
import type { CorrelationModel } from './model.ts';
import { resolveScale } from './scale.ts';

/** Relative change of the variance, and largest absolute change of a correlation; neither is negative. */
export interface MarginEffect {
  variance: number;
  correlation: number;
}

/** Effect of a straight side at `bufferKm`; a two-component model gives the larger of its components' magnitudes. */
export const straightSideExcess = (model: CorrelationModel, bufferKm: number): MarginEffect => cornerExcess(model, bufferKm, 0);

/**
 * Effect at a corner observation of the outline about which the boundary is an arc of radius `bufferKm`; `turning` is
 * the outline's change of direction there in radians (0: straight side).
 */
export function cornerExcess(model: CorrelationModel, bufferKm: number, turning: number): MarginEffect {
  const d = bufferKm / resolveScale(model).scaleKm;
  const m = model.steps;
  if (!(d > 0) || !(turning >= 0 && turning <= 2 * Math.PI))
    throw new NumericalError('MODEL_INVALID', `A buffer of ${bufferKm} km with a turning of ${turning} radians has no boundary effect to compute. Give a positive buffer and a turning from 0 to 2 pi.`, { details: { bufferKm, turning } });
  const scalar = maternCorrelation(m, 2 * d) + (turning > 0 ? (turning / (2 * Math.PI)) * discExcess(m, d) : 0);
  const variance = model.kind === 'vector' ? largestOverShares(model, (share) => largestComponent(cornerComponentExcess(m, d, turning, share))) : scalar;
  return { variance, correlation: correlationChangeOf(m, scalar) };
}

/** `f` at the model's rotational share, or the larger over pure rotation and pure divergence where none is given. */
export const largestOverShares = (model: CorrelationModel, f: (share: number) => number): number =>
  model.rotationalShare === undefined ? Math.max(f(0), f(1)) : f(model.rotationalShare);

/** The effect that the tolerance is about: of correlations under exact normalisation, of variances under theory. */
export const effectInForce = (model: CorrelationModel, effect: MarginEffect): number =>
  model.normalisation === 'exact' ? effect.correlation : effect.variance;

/** Smallest buffer in km from which on the effect in force stays within the tolerance, at a corner of that turning. */
export function bufferForTolerance(model: CorrelationModel, turning = 0): number {
  const { scaleKm } = resolveScale(model);
  const exceeds = (d: number) => effectInForce(model, cornerExcess(model, d * scaleKm, turning)) > model.tolerance;
  if (!(model.tolerance > 0))
    throw new NumericalError('MODEL_INVALID', `The tolerance is ${model.tolerance}. Give a positive share, such as 0.01 for 1 %.`, { details: { field: 'tolerance' } });
  const step = 0.125;
  // inwards from far out: components change sign on the way, and the outermost crossing counts
  let high = step;
  while (effectBeyond(high) || exceeds(high)) high *= 2;
  while (high > step && !exceeds(high - step)) high -= step;
  if (high <= step) return step * scaleKm;
  let low = high - step;
  for (let k = 0; k < 50; k++) {
    const middle = (low + high) / 2;
    if (exceeds(middle)) low = middle;
    else high = middle;
  }
  return high * scaleKm;

  function effectBeyond(d: number): boolean {
    return maternCorrelation(model.steps, 2 * d) * (model.steps + 2) > model.tolerance;
  }
}
