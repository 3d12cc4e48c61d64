import { NumericalError } from '#core/errors.ts';
import type { CorrelationModel } from './model.ts';

/**
 * Diffusion scale l and Daley length D = l sqrt(2m - 4) of a model, both in km; D is null for m = 2, where it is zero
 * (Weaver & Mirouze 2013). Throws MODEL_INVALID when neither or both are given, or D with m = 2.
 */
export function resolveScale(model: Pick<CorrelationModel, 'daleyKm' | 'scaleKm' | 'steps'>): {
  scaleKm: number;
  daleyKm: number | null;
} {
  const { daleyKm, scaleKm, steps } = model;
  if (!Number.isInteger(steps) || steps < 2)
    throw new NumericalError('MODEL_INVALID', `The number of implicit steps is ${steps}. Give a whole number of at least 2.`, { details: { field: 'steps', value: steps } });
  const given = daleyKm ?? scaleKm;
  if ((daleyKm === undefined) === (scaleKm === undefined) || given === undefined)
    throw new NumericalError('MODEL_INVALID', 'The correlation model needs either the Daley length or the diffusion scale. Give exactly one of them.', { details: { field: 'daleyKm' } });
  if (!(given > 0) || !Number.isFinite(given))
    throw new NumericalError('MODEL_INVALID', `The length of the correlation model is ${given} km. Give a positive distance.`, { details: { value: given } });
  if (daleyKm !== undefined && steps === 2)
    throw new NumericalError('MODEL_INVALID', 'With 2 steps the Daley length is zero. Give the diffusion scale instead, or at least 3 steps.', { details: { field: 'daleyKm' } });
  const ratio = Math.sqrt(2 * steps - 4);
  return daleyKm !== undefined
    ? { scaleKm: daleyKm / ratio, daleyKm }
    : { scaleKm: given, daleyKm: steps === 2 ? null : given * ratio };
}

/** Normalisation factor gamma^2 = 4 pi (m - 1) l^2 in km²: 1 / gamma^2 is the variance in the unbounded plane. */
export const theoreticalNormalisation = (steps: number, scaleKm: number): number =>
  4 * Math.PI * (steps - 1) * scaleKm * scaleKm;
