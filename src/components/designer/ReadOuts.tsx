import type { ReactNode } from 'react';

import type { DesignResult } from '#client/design/compute-design.ts';
import { formatAgainst, formatCount, formatLarge, formatNumber, formatPercent } from '#client/design/words.ts';
import type { Place } from '#client/map/place.ts';
import { showPlace } from '#client/map/place.ts';
import type { Correlation } from '#schemas/correlation.ts';

interface ReadOutsProps {
  result: DesignResult | null;
  model: Correlation;
}

/** The live figures of the mesh on the map. */
export const ReadOuts = ({ result, model }: ReadOutsProps) => {
  const figures = result?.figures;
  const { tolerance, normalisation, steps } = model;
  const effect = (kind: 'variance' | 'correlation') => {
    const worst = figures?.[kind];
    const isInForce = (kind === 'correlation') === (normalisation === 'exact');
    const isOver = isInForce && worst !== undefined && worst.value > tolerance;
    return (
      <Figure
        key={kind}
        label={kind === 'variance' ? 'Variance change' : 'Correlation change'}
        note={isInForce ? `largest; limit ${formatPercent(tolerance)}` : 'largest; to compare'}
        place={worst && { observations: [worst.observation] }}
        placeWords={worst && `at observation ${worst.observation}`}
        tone={isInForce && worst ? (isOver ? 'fail' : 'pass') : undefined}
      >
        {worst ? (isInForce ? formatAgainst(worst.value, tolerance) : formatPercent(worst.value)) : '–'}
      </Figure>
    );
  };
  return (
    <dl aria-label="Figures of this mesh" className="grid grid-cols-2 border-b border-line-strong bg-linen sm:grid-cols-4 xl:grid-cols-8">
      <Figure label="Nodes" note={figures ? `${formatCount(figures.observations)} observations` : ''}>{figures ? formatCount(figures.nodes) : '–'}</Figure>
      <Figure label="Elements" note="triangles">{figures ? formatCount(figures.elements) : '–'}</Figure>
      <Figure
        label={steps === 2 ? 'Local h/l, 95 %' : 'Local h/D, 95 %'}
        note={figures?.coarseness ? `largest ${formatNumber(figures.coarseness.largest, 2)}` : ''}
        place={figures?.coarseness ? { nodes: [figures.coarseness.node] } : undefined}
        placeWords="show it"
      >
        {figures?.coarseness ? formatNumber(figures.coarseness.p95, 2) : '–'}
      </Figure>
      <Figure label="Smallest angle" note="for conditioning" place={figures && { elements: [figures.smallestAngle.element] }} placeWords="show it">
        {figures ? `${formatNumber(figures.smallestAngle.value)}°` : '–'}
      </Figure>
      {normalisation === 'exact' ? [effect('correlation'), effect('variance')] : [effect('variance'), effect('correlation')]}
      <Figure label="Non-zeros of A" note="M + l²K, both halves">{figures ? formatLarge(figures.nonZeros) : '–'}</Figure>
      <Figure label="One application" note={`non-zeros × ${steps} steps`}>{figures ? formatLarge(figures.nonZeros * steps) : '–'}</Figure>
    </dl>
  );
};

interface FigureProps {
  label: string;
  note: string;
  place?: Place;
  placeWords?: string;
  tone?: 'pass' | 'fail';
  children: ReactNode;
}

const Figure = ({ label, note, place, placeWords, tone, children }: FigureProps) => (
  <div className="flex min-w-0 flex-col border-line px-3 py-1.5 not-first:border-l max-xl:border-b">
    <dt className="font-mono text-[0.6875rem] text-ink-soft">{label}</dt>
    <dd className={`font-mono text-lg leading-tight tabular-nums ${tone === 'fail' ? 'text-madder' : 'text-ink'}`}>
      {tone && <span aria-hidden="true" className={tone === 'fail' ? '' : 'text-lichen'}>{tone === 'fail' ? '✕ ' : '✓ '}</span>}
      {children}
      {tone && <span className="sr-only">{tone === 'fail' ? ' beyond the limit' : ' within the limit'}</span>}
    </dd>
    <dd className="font-mono text-[0.6875rem] text-ink-soft">
      {note}
      {place && placeWords && (
        <button type="button" className="block py-0.5 text-left text-woad underline underline-offset-2 hover:text-ink focus-visible:outline-2 focus-visible:outline-woad" onClick={() => showPlace(place)}>
          {placeWords}
        </button>
      )}
    </dd>
  </div>
);
