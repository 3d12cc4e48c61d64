import type { BoundaryEffect } from '#core/correlation/boundary-effect.ts';
import { bufferForTolerance } from '#core/correlation/boundary-effect.ts';
import type { CorrelationModel } from '#core/correlation/model.ts';
import type { CheckedMesh } from './checked-mesh.ts';
import type { Limits, Measured } from './judge.ts';
import { placesOf, worstBeyond } from './judge.ts';

const SOURCE = 'Prediction: method of images, Green\'s identity along rays, closed form of the disc (Carslaw & Jaeger 1959)';

/** What a check knows of the boundary: the effect and the distance to it, one per observation; null without a map. */
export interface BoundaryFigures {
  effect: BoundaryEffect;
  distanceKm: Float64Array;
}

/** The boundary's effect on what is asked for, and the buffer that would meet the tolerance. */
export function boundaryFindings(mesh: CheckedMesh, figures: BoundaryFigures | null, model: CorrelationModel, limits: Limits): Measured[] {
  const isExact = model.normalisation === 'exact';
  const kinds = { variance: 'variance', correlation: 'correlations' } as const;
  const force = isExact ? 'correlation' : 'variance';
  const other = isExact ? 'variance' : 'correlation';
  const base = { group: 'boundary', source: SOURCE } as const;
  const titles = { force: `Boundary effect on the ${kinds[force]}`, other: `Boundary effect on the ${kinds[other]}, for information`, buffer: 'Shortest distance from an observation to the boundary' };
  if (!figures) {
    const blank = { ...base, value: null, place: {}, placeCount: 0, explanation: 'The natural boundary condition reflects, and changes the correlations of observations near it. Not judged: the mesh came without an observation-to-node map.' };
    return [
      { ...blank, id: 'boundary-effect', title: titles.force, unit: '%' },
      { ...blank, id: 'boundary-effect-other', title: titles.other, unit: '%' },
      { ...blank, id: 'buffer', title: titles.buffer, unit: 'km', direction: 'below' },
    ];
  }
  const all = Uint32Array.from(figures.distanceKm, (_, i) => i);
  const percent = { variance: figures.effect.variance.map((v) => 100 * v), correlation: figures.effect.correlation.map((v) => 100 * v) };
  const worst = (values: Float64Array, bound: number | null) => worstBeyond(values, all, bound, 'above');
  const inForce = worst(percent[force], limits['boundary-effect'].warn);
  const beside = worst(percent[other], null);
  const near = worstBeyond(figures.distanceKm, all, null, 'below');
  const turning = sharpestRoundedCorner(mesh);
  const straightKm = bufferForTolerance(model);
  const cornerKm = bufferForTolerance(model, turning);
  const statement = isExact
    ? 'The design normalises by the exact diagonal, so variances are right by construction and the change of correlations is what remains.'
    : 'The design normalises by the theoretical factor, so the change of the variance is the error that the boundary makes.';
  return [
    {
      ...base, id: 'boundary-effect', title: titles.force, unit: '%', value: inForce.length > 0 ? percent[force][inForce[0]] : null, ...placesOf('observations', inForce),
      explanation: `${statement} This is the predicted effect at the worst observation, against the design's tolerance; it predicts accuracy, and the exact calculation has the last word.`,
    },
    {
      ...base, id: 'boundary-effect-other', title: titles.other, unit: '%', value: beside.length > 0 ? percent[other][beside[0]] : null, ...placesOf('observations', beside),
      explanation: `It is what would count if the receiving code normalised by the ${isExact ? 'theoretical factor' : 'exact diagonal'} instead. It is shown without a limit, because this design states the other.`,
    },
    {
      ...base, id: 'buffer', title: titles.buffer, unit: 'km', direction: 'below', value: near.length > 0 ? figures.distanceKm[near[0]] : null, ...placesOf('observations', near),
      explanation: `The buffer keeps the boundary away from the observations: along straight sides ${straightKm.toFixed(1)} km meet the tolerance${turning > 0 ? `, and ${cornerKm.toFixed(1)} km at the sharpest rounded corner, which focuses the effect` : ''}. It is judged by what it costs, in the boundary effect above, unless the policy sets a distance.`,
    },
  ];
}

/** Largest turning of an outline corner with an arc about it, radians; 0 without arcs. */
function sharpestRoundedCorner(mesh: CheckedMesh): number {
  return (mesh.outlineCorners ?? []).reduce((most, corner) => (corner.isRounded ? Math.max(most, corner.turning) : most), 0);
}
