import { niceStep } from '#client/design/margin-scale.ts';
import { formatKm } from '#client/design/words.ts';

/** Length of a scale bar: a round distance on the ground and its pixels, at most `mostPixels`. */
export const scaleBar = (pixelsPerKm: number, mostPixels: number): { km: number; pixels: number; label: string } => {
  const km = niceStep(mostPixels / pixelsPerKm);
  return { km, pixels: km * pixelsPerKm, label: km < 0.01 ? `${Number((km * 1000).toPrecision(2))} m` : formatKm(km) };
};
