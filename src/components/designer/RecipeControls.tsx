import { useId } from 'react';

import type { Recipe } from '#core/design/recipe.ts';
import type { DesignResult } from '#client/design/compute-design.ts';
import { formatKm, formatNumber } from '#client/design/words.ts';

import { Choice, NumberField, Section } from './fields.tsx';

interface RecipeControlsProps {
  recipe: Recipe;
  result: DesignResult | null;
  isReadOnly: boolean;
  onChange(change: Partial<Recipe>, gesture?: string): void;
  onDone(): void;
}

/** Outline, buffer, spacing and growth of the recipe. */
export const RecipeControls = ({ recipe, result, isReadOnly, onChange, onDone }: RecipeControlsProps) => (
  <>
    <Section title="Outline and buffer" brief={`${recipe.outline.kind === 'convex' ? 'convex hull' : 'box'}, ${formatKm(recipe.bufferKm)}, ${recipe.corners}`} isOpen>
      <Choice
        label="Outline around the observations"
        value={recipe.outline.kind}
        isDisabled={isReadOnly}
        options={[
          { value: 'convex', label: 'Convex hull', hint: 'The tightest outline without dents: fewest elements.' },
          { value: 'box', label: 'Box', hint: 'A box along the axes: four right-angled corners, more elements where it is empty.' },
        ]}
        onChange={(kind) => onChange({ outline: { kind } })}
      />
      <NumberField label="Buffer" unit="km" value={recipe.bufferKm} min={0.001} max={20_000} isDisabled={isReadOnly} onChange={(km) => km !== null && onChange({ bufferKm: km }, 'buffer')} onDone={onDone} />
      <BufferSlider bufferKm={recipe.bufferKm} isReadOnly={isReadOnly} onChange={(km) => onChange({ bufferKm: km }, 'buffer-slider')} onDone={onDone} />
      <Choice
        label="Corners of the boundary"
        value={recipe.corners}
        isDisabled={isReadOnly}
        options={[
          { value: 'round', label: 'Round', hint: 'An arc about each corner of the outline. It focuses the boundary effect on the observation at its centre, the more the sharper the corner.' },
          { value: 'square', label: 'Square', hint: 'Straight sides run on beyond the corners. The effect stays near that of a straight side, for some more elements in the corners.' },
        ]}
        onChange={(corners) => onChange({ corners })}
      />
    </Section>
    <Section title="Spacing and growth" brief={`${recipe.coreSpacingKm === undefined ? 'derived' : formatKm(recipe.coreSpacingKm)}, × ${formatNumber(recipe.growth)}`} isOpen>
      <NumberField
        label="Core spacing"
        unit="km"
        value={recipe.coreSpacingKm ?? null}
        min={1e-6}
        max={20_000}
        emptyMeans={result && recipe.coreSpacingKm === undefined ? `derived: ${formatKm(result.mesh.coreSpacingKm)}` : 'derived'}
        hint={recipe.coreSpacingKm === undefined ? 'Empty: derived from the local spacing of the observations.' : 'Edge length that gaps between observations are filled to. Empty: derived.'}
        isDisabled={isReadOnly}
        onChange={(km) => onChange({ coreSpacingKm: km ?? undefined }, 'spacing')}
        onDone={onDone}
      />
      <NumberField
        label="Growth per element in the buffer"
        value={recipe.growth}
        min={1.05}
        max={3}
        hint={growthWords(recipe.growth)}
        isDisabled={isReadOnly}
        onChange={(growth) => growth !== null && onChange({ growth }, 'growth')}
        onDone={onDone}
      />
    </Section>
  </>
);

const growthWords = (growth: number): string =>
  growth <= 1.25
    ? 'Gentle: changes the variance at observations by at most about 1 %.'
    : growth <= 1.6
      ? 'Moderate: may change the variance at observations by 2 to 3 %.'
      : 'Steep: may change the variance at observations by 4 to 5 %.';

const SLIDER_STEPS = 400;

interface BufferSliderProps {
  bufferKm: number;
  isReadOnly: boolean;
  onChange(km: number): void;
  onDone(): void;
}

/** Four decades about the buffer's own would be coarse: the slider spans a factor of 8 either way of a round power of two. */
const BufferSlider = ({ bufferKm, isReadOnly, onChange, onDone }: BufferSliderProps) => {
  const id = useId();
  const middle = 4 ** Math.round(Math.log2(bufferKm) / 2);
  const low = middle / 4;
  const high = middle * 4;
  const at = (SLIDER_STEPS * Math.log(bufferKm / low)) / Math.log(high / low);
  return (
    <div className="flex items-center gap-2 font-mono text-[0.6875rem] text-ink-soft tabular-nums">
      <label htmlFor={id} className="sr-only">Buffer, by slider</label>
      <span>{formatKm(low)}</span>
      <input
        id={id}
        type="range"
        className="h-6 min-w-0 flex-1 accent-madder"
        min={0}
        max={SLIDER_STEPS}
        value={at}
        step={1}
        disabled={isReadOnly}
        aria-valuetext={formatKm(bufferKm)}
        onChange={({ target }) => onChange(Number((low * (high / low) ** (Number(target.value) / SLIDER_STEPS)).toPrecision(3)))}
        onPointerUp={onDone}
        onBlur={onDone}
      />
      <span>{formatKm(high)}</span>
    </div>
  );
};
