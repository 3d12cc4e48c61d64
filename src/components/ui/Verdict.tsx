import type { Verdict as VerdictWord } from '#core/findings/finding.ts';

const LOOK: Record<VerdictWord, { icon: string; word: string; className: string }> = {
  pass: { icon: '✓', word: 'pass', className: 'text-lichen' },
  warn: { icon: '△', word: 'warn', className: 'text-weld' },
  fail: { icon: '✕', word: 'fail', className: 'text-madder' },
  'not-judged': { icon: '○', word: 'not judged', className: 'text-ink-soft' },
};

/** A verdict as icon and word. */
export const Verdict = ({ verdict }: { verdict: VerdictWord }) => {
  const { icon, word, className } = LOOK[verdict];
  return (
    <span className={`inline-flex items-baseline gap-1.5 font-bold whitespace-nowrap ${className}`}>
      <span aria-hidden="true">{icon}</span>
      {word}
    </span>
  );
};
