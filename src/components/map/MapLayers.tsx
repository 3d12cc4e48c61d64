import { useEffect, useLayoutEffect, useRef, useState } from 'react';

import { scaleGradient } from '#client/map/colour-scale.ts';
import type { LayerChoice } from '#client/map/map-scene.ts';
import { readThemeColours, watchTheme } from '#client/map/theme-colours.ts';

export interface Legend {
  title: string;
  low: string;
  high: string;
  /** Words for what lies beyond the scale, drawn with a thick madder rim. */
  beyond?: string;
}

interface MapLayersProps {
  layers: LayerChoice;
  /** Which can be switched, with their names. */
  choices: Partial<Record<keyof LayerChoice, string>>;
  legend: Legend | null;
  onChange(layers: LayerChoice): void;
}

/** Switches of the map's layers and the legend of the colour scale in use. */
export const MapLayers = ({ layers, choices, legend, onChange }: MapLayersProps) => {
  const panel = useRef<HTMLDetailsElement>(null);
  const [isOpen, setIsOpen] = useState(false);
  useLayoutEffect(() => {
    // on a small map the panel would hide what it is about
    setIsOpen((panel.current?.parentElement?.clientWidth ?? 0) >= 560);
  }, []);
  return (
    <details ref={panel} open={isOpen} onToggle={({ currentTarget }) => setIsOpen(currentTarget.open)} className="group absolute top-3 left-3 max-w-60 border border-line-strong bg-linen-raised/95 font-mono text-xs text-ink">
      <summary className="flex min-h-8 cursor-pointer list-none items-center gap-2 px-3 hover:bg-linen-sunk focus-visible:outline-2 focus-visible:outline-woad">
        <span aria-hidden="true" className="inline-block w-2.5 text-ink-soft transition-transform group-open:rotate-90 motion-reduce:transition-none">›</span>
        Layers
      </summary>
      <fieldset className="px-3 pb-2">
        <legend className="sr-only">Map layers</legend>
        <div className="flex flex-col">
          {(Object.entries(choices) as [keyof LayerChoice, string][]).map(([name, words]) => (
            <label key={name} className="flex min-h-7 items-center gap-2">
              <input type="checkbox" className="size-4 accent-woad" checked={layers[name]} onChange={({ target }) => onChange({ ...layers, [name]: target.checked })} />
              {words}
            </label>
          ))}
        </div>
        {legend && <ScaleLegend {...legend} />}
      </fieldset>
    </details>
  );
};

const ScaleLegend = ({ title, low, high, beyond }: Legend) => {
  const [gradient, setGradient] = useState(() => scaleGradient(readThemeColours().scale));
  useEffect(() => {
    const watch = watchTheme(() => setGradient(scaleGradient(readThemeColours().scale)));
    return () => watch.destroy();
  }, []);
  return (
    <div className="mt-1.5 border-t border-line pt-1.5">
      <div>{title}</div>
      <div className="mt-1 h-2.5 border border-line-strong" style={{ backgroundImage: gradient }} />
      <div className="flex justify-between gap-4 tabular-nums">
        <span>{low}</span>
        <span>{high}</span>
      </div>
      {beyond && (
        <div className="flex items-center gap-1.5">
          <span aria-hidden="true" className="inline-block size-3 rounded-full border-3 border-madder" />
          {beyond}
        </div>
      )}
    </div>
  );
};
