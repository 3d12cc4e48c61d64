import type { ReactNode } from 'react';
import { useId, useState } from 'react';

const INPUT = 'h-8 w-full border border-line-strong bg-linen-raised px-2 font-mono text-sm text-ink tabular-nums disabled:bg-linen-sunk focus-visible:outline-2 focus-visible:outline-woad aria-invalid:border-madder';

export const BUTTON =
  'inline-flex min-h-8 items-center justify-center gap-1.5 border border-line-strong bg-linen-raised px-3 font-mono text-xs text-ink hover:bg-linen-sunk disabled:cursor-not-allowed disabled:text-ink-soft disabled:hover:bg-linen-raised focus-visible:outline-2 focus-visible:outline-offset-1 focus-visible:outline-woad';
export const PRIMARY =
  'inline-flex min-h-8 items-center justify-center gap-1.5 border border-woad bg-woad px-3 font-mono text-xs font-semibold text-linen-raised hover:bg-ink disabled:cursor-not-allowed disabled:border-line-strong disabled:bg-linen-sunk disabled:text-ink-soft focus-visible:outline-2 focus-visible:outline-offset-1 focus-visible:outline-woad';

interface SectionProps {
  title: string;
  /** The section's choice in a few words, read while it is closed. */
  brief?: string;
  isOpen?: boolean;
  children: ReactNode;
}

export const Section = ({ title, brief, isOpen = false, children }: SectionProps) => (
  <details open={isOpen} className="group border-b border-line">
    <summary className="flex min-h-9 cursor-pointer list-none items-baseline gap-2 px-4 py-2 font-mono text-xs hover:bg-linen-sunk focus-visible:outline-2 focus-visible:-outline-offset-2 focus-visible:outline-woad">
      <span aria-hidden="true" className="inline-block w-2.5 text-ink-soft transition-transform group-open:rotate-90 motion-reduce:transition-none">›</span>
      <span className="shrink-0 font-semibold whitespace-nowrap text-ink">{title}</span>
      {brief && <span className="ml-auto truncate text-right text-ink-soft tabular-nums">{brief}</span>}
    </summary>
    <div className="flex flex-col gap-3 px-4 pt-1 pb-4">{children}</div>
  </details>
);

interface NumberFieldProps {
  label: string;
  /** null: an empty field. */
  value: number | null;
  unit?: string;
  min?: number;
  max?: number;
  /** An empty field is allowed, and means this. */
  emptyMeans?: string;
  hint?: string;
  isDisabled?: boolean;
  onChange(value: number | null): void;
  onDone?(): void;
}

/** A number typed in full: what does not read as one in range is told, and changes nothing. */
export const NumberField = ({ label, value, unit, min = -Infinity, max = Infinity, emptyMeans, hint, isDisabled, onChange, onDone }: NumberFieldProps) => {
  const id = useId();
  const [typed, setTyped] = useState<string | null>(null);
  const text = typed ?? (value === null ? '' : String(value));
  const problem = problemOfNumber(text, min, max, emptyMeans !== undefined, unit);
  const handleChange = (next: string): void => {
    setTyped(next);
    if (problemOfNumber(next, min, max, emptyMeans !== undefined, unit) === '') onChange(next.trim() === '' ? null : Number(next.replace(',', '.')));
  };
  return (
    <div className="flex flex-col gap-1">
      <label htmlFor={id} className="font-mono text-xs text-ink">
        {label}
        {unit && <span className="text-ink-soft"> ({unit})</span>}
      </label>
      <input
        id={id}
        inputMode="decimal"
        autoComplete="off"
        className={INPUT}
        value={text}
        placeholder={emptyMeans}
        disabled={isDisabled}
        aria-invalid={problem !== ''}
        aria-describedby={problem || hint ? `${id}-note` : undefined}
        onChange={({ target }) => handleChange(target.value)}
        onBlur={() => {
          setTyped(null);
          onDone?.();
        }}
      />
      {(problem || hint) && (
        <p id={`${id}-note`} role={problem ? 'alert' : undefined} className={`font-prose text-sm ${problem ? 'text-madder' : 'text-ink-soft'}`}>
          {problem || hint}
        </p>
      )}
    </div>
  );
};

const problemOfNumber = (text: string, min: number, max: number, isEmptyAllowed: boolean, unit = ''): string => {
  if (text.trim() === '') return isEmptyAllowed ? '' : 'Give a number.';
  const value = Number(text.replace(',', '.'));
  if (!Number.isFinite(value)) return `"${text.slice(0, 20)}" is not a number.`;
  if (value < min) return `At least ${min} ${unit}.`;
  if (value > max) return `At most ${max.toLocaleString('en-GB')} ${unit}.`;
  return '';
};

interface ChoiceProps<T extends string> {
  label: string;
  value: T;
  options: { value: T; label: string; hint?: string }[];
  isDisabled?: boolean;
  onChange(value: T): void;
}

/** One of a few, each with its consequence in words. */
export const Choice = <T extends string>({ label, value, options, isDisabled, onChange }: ChoiceProps<T>) => {
  const name = useId();
  const hint = options.find((option) => option.value === value)?.hint;
  return (
    <fieldset className="flex flex-col gap-1">
      <legend className="mb-1 font-mono text-xs text-ink">{label}</legend>
      <div className="flex border border-line-strong">
        {options.map((option) => (
          <label
            key={option.value}
            className="flex min-h-8 flex-1 cursor-pointer items-center justify-center border-line-strong px-2 text-center font-mono text-xs text-ink not-first:border-l has-checked:bg-woad-wash has-checked:font-semibold has-disabled:cursor-not-allowed has-focus-visible:outline-2 has-focus-visible:outline-woad"
          >
            <input type="radio" className="sr-only" name={name} value={option.value} checked={option.value === value} disabled={isDisabled} onChange={() => onChange(option.value)} />
            <span aria-hidden="true" className="mr-1">{option.value === value ? '●' : '○'}</span>
            {option.label}
          </label>
        ))}
      </div>
      {hint && <p className="font-prose text-sm text-ink-soft">{hint}</p>}
    </fieldset>
  );
};
