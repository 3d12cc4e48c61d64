import type { CorrelationModel } from '#core/correlation/model.ts';
import { cornerExcess, effectInForce } from '#core/correlation/boundary-effect.ts';

/** Distances in km from the outermost observation at which the elements of the buffer end; at most 400. */
export const elementTicks = (bufferKm: number, coreSpacingKm: number, growth: number): number[] => {
  const slope = (2 * (growth - 1)) / (growth + 1);
  const ticks: number[] = [];
  let at = 0;
  // an element whose mean size is that of its own middle
  while (ticks.length < 400) {
    at += (coreSpacingKm + slope * at) / (1 - slope / 2);
    if (at >= bufferKm) break;
    ticks.push(at);
  }
  return ticks;
};

/** The nearest of 1, 2 and 5 times a power of ten at or below a positive number. */
export const niceStep = (value: number): number => {
  const power = 10 ** Math.floor(Math.log10(value));
  const lead = value / power;
  return (lead >= 5 ? 5 : lead >= 2 ? 2 : 1) * power;
};

/** Step of the arrow keys at a buffer: about a fiftieth of it, a round figure. */
export const bufferStep = (bufferKm: number): number => niceStep(bufferKm / 50);

/** A dragged distance as a round figure of three significant digits. */
export const roundBuffer = (km: number): number => Number(km.toPrecision(3));

export interface EffectCurve {
  /** km */
  at: number[];
  /** Effect in force at a straight side, and at the sharpest rounded corner. */
  straight: number[];
  corner: number[];
}

/** The effect in force over the buffer, from `from` to `to` km, in even steps. */
export const effectCurve = (model: CorrelationModel, turning: number, from: number, to: number, points = 60): EffectCurve => {
  const at = Array.from({ length: points }, (_, k) => from + ((to - from) * k) / (points - 1));
  const of = (angle: number) => at.map((km) => effectInForce(model, cornerExcess(model, km, angle)));
  return { at, straight: of(0), corner: turning > 0 ? of(turning) : [] };
};

/** Round values between 0 and `end`, at most `most` of them. */
export const axisTicks = (end: number, most: number): number[] => {
  let step = niceStep(end / most);
  while (end / step > most) step = niceStep(step * 2.5);
  const ticks: number[] = [];
  for (let k = 0; k * step <= end * (1 + 1e-9); k++) ticks.push(Number((k * step).toPrecision(12)));
  return ticks;
};

/** Powers of ten within a range of shares, the axis of the effect. */
export const powerTicks = (low: number, high: number): number[] => {
  const ticks: number[] = [];
  for (let e = Math.ceil(Math.log10(low) - 1e-9); 10 ** e <= high * (1 + 1e-9); e++) ticks.push(10 ** e);
  return ticks;
};
