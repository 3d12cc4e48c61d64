import { memo } from 'react';

import { resolveScale } from '#core/correlation/scale.ts';
import type { Correlation } from '#schemas/correlation.ts';
import { formatKm, formatPercent } from '#client/design/words.ts';

import { BUTTON, Choice, NumberField, Section } from './fields.tsx';

interface ModelControlsProps {
  /** The model in force. */
  model: Correlation;
  /** Whether it is the design's own. */
  isOwn: boolean;
  isReadOnly: boolean;
  onChange(model: Correlation | null, gesture?: string): void;
  onDone(): void;
}

/** The correlation model: the study's, until the design is given its own. */
export const ModelControls = memo(({ model, isOwn, isReadOnly, onChange, onDone }: ModelControlsProps) => {
  const { scaleKm, daleyKm } = resolveScale(model);
  const length = daleyKm === null ? `l ${formatKm(scaleKm)}` : `D ${formatKm(daleyKm)}`;
  const change = (part: Partial<Correlation>, gesture?: string): void => onChange({ ...model, ...part }, gesture);
  const isDisabled = isReadOnly || !isOwn;
  return (
    <Section title="Correlation model" brief={`${isOwn ? 'own: ' : ''}${length}, m = ${model.steps}`}>
      <p className="font-prose text-sm text-ink-soft">
        {isOwn ? 'This design has a correlation model of its own; the study’s does not change.' : 'The study’s correlation model holds for this design.'}
      </p>
      {!isReadOnly && (
        <button type="button" className={BUTTON} onClick={() => onChange(isOwn ? null : { ...model })}>
          {isOwn ? 'Use the study’s model again' : 'Give this design its own model'}
        </button>
      )}
      <div className="grid grid-cols-2 gap-2">
        {model.scaleKm === undefined ? (
          <NumberField label="Daley length D" unit="km" value={model.daleyKm ?? null} min={1e-3} max={20_000} isDisabled={isDisabled} hint={`l = ${formatKm(scaleKm)}`} onChange={(km) => km !== null && change({ daleyKm: km }, 'daley')} onDone={onDone} />
        ) : (
          <NumberField label="Diffusion scale l" unit="km" value={model.scaleKm} min={1e-3} max={20_000} isDisabled={isDisabled} hint={daleyKm === null ? undefined : `D = ${formatKm(daleyKm)}`} onChange={(km) => km !== null && change({ scaleKm: km }, 'scale')} onDone={onDone} />
        )}
        <NumberField label="Implicit steps m" value={model.steps} min={model.daleyKm === undefined && model.kind === 'scalar' ? 2 : 3} max={20} isDisabled={isDisabled} onChange={(steps) => steps !== null && Number.isInteger(steps) && change({ steps }, 'steps')} onDone={onDone} />
      </div>
      <NumberField label="Tolerance of the boundary effect" unit="%" value={Number((100 * model.tolerance).toPrecision(6))} min={0.0001} max={50} isDisabled={isDisabled} onChange={(percent) => percent !== null && change({ tolerance: percent / 100 }, 'tolerance')} onDone={onDone} />
      <Choice
        label="Normalisation in the receiving code"
        value={model.normalisation}
        isDisabled={isDisabled}
        options={[
          { value: 'exact', label: 'Exact diagonal', hint: `Variances are right by construction; the tolerance of ${formatPercent(model.tolerance)} is on the change of correlations.` },
          { value: 'theory', label: 'Theory', hint: `The code divides by the theoretical factor; the tolerance of ${formatPercent(model.tolerance)} is on the change of variances.` },
        ]}
        onChange={(normalisation) => change({ normalisation })}
      />
      <Choice
        label="Mass matrix"
        value={model.mass}
        isDisabled={isDisabled}
        options={[
          { value: 'consistent', label: 'Consistent', hint: 'Two to three times more accurate on the same mesh.' },
          { value: 'lumped', label: 'Lumped', hint: 'Keeps correlations positive and has a simple square root, on a finer mesh.' },
        ]}
        onChange={(mass) => change({ mass })}
      />
      <p className="font-mono text-xs text-ink-soft">
        {model.kind === 'vector' ? `two components${model.rotationalShare === undefined ? '' : `, rotational share ${formatPercent(model.rotationalShare)}`}` : 'one component'}, sphere radius {formatKm(model.sphereRadiusKm)}
      </p>
    </Section>
  );
});
ModelControls.displayName = 'ModelControls';
