import type { DesignResult } from '#client/design/compute-design.ts';
import { formatKm, formatPercent } from '#client/design/words.ts';
import type { LayerChoice } from '#client/map/map-scene.ts';
import type { CorrelationModel } from '#core/correlation/model.ts';

import type { Legend } from './MapLayers.tsx';

/** Words for a scale over spacings: its ends are the smallest and the 98th percentile. */
export const spacingLegend = (spacingKm: Float64Array): Legend => {
  const sorted = spacingKm.slice().sort();
  return { title: 'Local spacing', low: formatKm(sorted[0]), high: `${formatKm(sorted[Math.floor(0.98 * (sorted.length - 1))])} and more` };
};

/** Legend of the layer that uses the colour scale, the spacing first. */
export const legendOf = (layers: LayerChoice, result: DesignResult | null, model: CorrelationModel): Legend | null => {
  if (layers.spacing && result?.cells) return spacingLegend(result.mesh.localSpacingKm);
  if (!layers.effect) return null;
  return { title: `Boundary effect (${model.normalisation === 'exact' ? 'correlation' : 'variance'})`, low: '0 %', high: formatPercent(model.tolerance), beyond: 'beyond the limit' };
};
