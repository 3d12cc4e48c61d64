import { memo, useId, useState } from 'react';

import type { Recipe, Selection } from '#core/design/recipe.ts';
import { readRing, writeRing } from '#client/design/polygon-text.ts';
import { formatCount, formatKm } from '#client/design/words.ts';
import type { ObservationSet } from '#schemas/observation-sets.ts';

import { Choice, NumberField, Section } from './fields.tsx';

interface SelectionControlsProps {
  set: ObservationSet;
  selection: Selection;
  /** How many observations come of how many rows. */
  brief: string;
  isReadOnly: boolean;
  onChange(change: Partial<Recipe>, gesture?: string): void;
  onDone(): void;
}

/** Which observations take part, and what happens to near ones. */
export const SelectionControls = memo(({ set, selection, brief, isReadOnly, onChange, onDone }: SelectionControlsProps) => {
  const change = (part: Partial<Selection>, gesture?: string): void => {
    const next = { ...selection, ...part };
    for (const key of Object.keys(next) as (keyof Selection)[]) if (next[key] === undefined) delete next[key];
    onChange({ selection: next }, gesture);
  };
  const { near } = selection;
  return (
    <>
      <Section title="Observations used" brief={brief}>
        {set.flags.length > 0 && (
          <Flags all={set.flags} kept={selection.flags} isReadOnly={isReadOnly} onChange={(flags) => change({ flags })} />
        )}
        {set.timeRange && (
          <TimeWindow range={set.timeRange} value={selection.timeWindow} isReadOnly={isReadOnly} onChange={(timeWindow) => change({ timeWindow }, 'time')} onDone={onDone} />
        )}
        {set.levelRange && (
          <div className="grid grid-cols-2 gap-2">
            <NumberField label="Level from" value={selection.level?.min ?? null} emptyMeans={String(set.levelRange.min)} isDisabled={isReadOnly} onChange={(min) => change({ level: levelOf(min, selection.level?.max ?? null, set.levelRange!) }, 'level')} onDone={onDone} />
            <NumberField label="Level to" value={selection.level?.max ?? null} emptyMeans={String(set.levelRange.max)} isDisabled={isReadOnly} onChange={(max) => change({ level: levelOf(selection.level?.min ?? null, max, set.levelRange!) }, 'level')} onDone={onDone} />
          </div>
        )}
        <Polygon key={`in-${writeRing(selection.keepInside)}`} label="Keep inside a polygon" crs={set.crs} ring={selection.keepInside} isReadOnly={isReadOnly} onChange={(keepInside) => change({ keepInside })} />
        <Polygon key={`out-${writeRing(selection.leaveOut)}`} label="Leave out a polygon" crs={set.crs} ring={selection.leaveOut} isReadOnly={isReadOnly} onChange={(leaveOut) => change({ leaveOut })} />
      </Section>
      <Section title="Near observations" brief={`${near.rule} under ${near.km === 0 ? '0 km' : formatKm(near.km)}`}>
        <NumberField label="Treat as one place when closer than" unit="km" value={near.km} min={0} max={20_000} isDisabled={isReadOnly} hint="0: only observations at exactly the same place." onChange={(km) => km !== null && change({ near: { ...near, km } }, 'near')} onDone={onDone} />
        <Choice
          label="What happens to them"
          value={near.rule}
          isDisabled={isReadOnly}
          options={[
            { value: 'combine', label: 'Combine', hint: 'Their inverse-variance mean, with its own standard deviation, takes their place.' },
            { value: 'thin', label: 'Thin', hint: 'One of them is kept as it is, by a rule that always chooses the same one.' },
            { value: 'refuse', label: 'Refuse', hint: 'No mesh is made while there are any; the pairs are named.' },
          ]}
          onChange={(rule) => change({ near: { ...near, rule } })}
        />
      </Section>
    </>
  );
});
SelectionControls.displayName = 'SelectionControls';

const levelOf = (min: number | null, max: number | null, range: { min: number; max: number }): Selection['level'] =>
  min === null && max === null ? undefined : { min: min ?? range.min, max: max ?? range.max };

interface FlagsProps {
  all: ObservationSet['flags'];
  kept: string[] | undefined;
  isReadOnly: boolean;
  onChange(flags: string[] | undefined): void;
}

const Flags = ({ all, kept, isReadOnly, onChange }: FlagsProps) => {
  const names = all.map((flag) => flag.name);
  const toggle = (name: string): void => {
    const before = kept ?? names;
    const next = before.includes(name) ? before.filter((one) => one !== name) : names.filter((one) => one === name || before.includes(one));
    onChange(next.length === names.length ? undefined : next);
  };
  return (
    <fieldset className="flex flex-col">
      <legend className="mb-1 font-mono text-xs text-ink">Quality flags to keep</legend>
      <div className="max-h-40 overflow-y-auto" tabIndex={all.length > 6 ? 0 : undefined}>
        {all.map(({ name, count }) => (
          <label key={name} className="flex min-h-7 items-center gap-2 font-mono text-xs text-ink">
            <input type="checkbox" className="size-4 accent-woad" checked={kept?.includes(name) ?? true} disabled={isReadOnly} onChange={() => toggle(name)} />
            <span>{name === '' ? '(no flag)' : name}</span>
            <span className="ml-auto text-ink-soft tabular-nums">{formatCount(count)}</span>
          </label>
        ))}
      </div>
    </fieldset>
  );
};

interface TimeWindowProps {
  range: { from: number; to: number };
  value: { from: number; to: number } | undefined;
  isReadOnly: boolean;
  onChange(value: { from: number; to: number } | undefined): void;
  onDone(): void;
}

const toLocal = (seconds: number): string => new Date(1000 * seconds).toISOString().slice(0, 19);

const TimeWindow = ({ range, value, isReadOnly, onChange, onDone }: TimeWindowProps) => {
  const id = useId();
  const current = value ?? range;
  const set = (end: 'from' | 'to', text: string): void => {
    const seconds = Date.parse(`${text}Z`) / 1000;
    if (!Number.isFinite(seconds)) return;
    const next = { ...current, [end]: seconds };
    onChange(next.from <= range.from && next.to >= range.to ? undefined : next);
  };
  const isTurned = current.from > current.to;
  return (
    <fieldset className="flex flex-col gap-1">
      <legend className="mb-1 font-mono text-xs text-ink">Time window (UTC, both ends included)</legend>
      {(['from', 'to'] as const).map((end) => (
        <div key={end} className="grid grid-cols-[3rem_1fr] items-center gap-2">
          <label htmlFor={`${id}-${end}`} className="font-mono text-xs text-ink-soft">{end}</label>
          <input
            id={`${id}-${end}`}
            type="datetime-local"
            step={1}
            className="h-8 min-w-0 border border-line-strong bg-linen-raised px-2 font-mono text-xs text-ink focus-visible:outline-2 focus-visible:outline-woad"
            value={toLocal(current[end])}
            disabled={isReadOnly}
            aria-invalid={isTurned}
            onChange={({ target }) => set(end, target.value)}
            onBlur={onDone}
          />
        </div>
      ))}
      {isTurned && <p role="alert" className="font-prose text-sm text-madder">The window ends before it begins.</p>}
    </fieldset>
  );
};

interface PolygonProps {
  label: string;
  crs: ObservationSet['crs'];
  ring: [number, number][] | undefined;
  isReadOnly: boolean;
  onChange(ring: [number, number][] | undefined): void;
}

const Polygon = ({ label, crs, ring, isReadOnly, onChange }: PolygonProps) => {
  const id = useId();
  const [text, setText] = useState(() => writeRing(ring));
  const read = readRing(text, crs);
  const problem = 'problem' in read ? read.problem : '';
  return (
    <div className="flex flex-col gap-1">
      <label htmlFor={id} className="font-mono text-xs text-ink">{label}</label>
      <textarea
        id={id}
        rows={Math.min(8, Math.max(2, text.split('\n').length))}
        spellCheck={false}
        className="border border-line-strong bg-linen-raised px-2 py-1 font-mono text-xs text-ink tabular-nums focus-visible:outline-2 focus-visible:outline-woad aria-invalid:border-madder"
        placeholder={crs === 'plane-km' ? 'x, y in km, one corner per line' : 'longitude, latitude, one corner per line'}
        value={text}
        disabled={isReadOnly}
        aria-invalid={problem !== ''}
        aria-describedby={problem ? `${id}-note` : undefined}
        onChange={({ target }) => setText(target.value)}
        onBlur={() => !problem && writeRing('ring' in read ? read.ring : undefined) !== writeRing(ring) && onChange('ring' in read ? read.ring : undefined)}
      />
      {problem && <p id={`${id}-note`} role="alert" className="font-prose text-sm text-madder">{problem}</p>}
    </div>
  );
};
