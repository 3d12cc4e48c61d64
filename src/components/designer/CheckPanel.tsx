import { memo, useEffect, useState } from 'react';

import type { CheckState } from '#client/design/design-session.ts';
import { formatCount, formatElapsed, formatNumber } from '#client/design/words.ts';
import { showPlace } from '#client/map/place.ts';
import type { Finding } from '#schemas/findings.ts';

import { BUTTON, PRIMARY } from './fields.tsx';

interface CheckPanelProps {
  check: CheckState;
  isOld: boolean;
  isReadOnly: boolean;
  onCheck(): void;
  onCancel(): void;
  onSave(): void;
}

export const VERDICTS = {
  pass: { icon: '✓', word: 'pass', className: 'text-lichen' },
  warn: { icon: '▲', word: 'warn', className: 'text-weld' },
  fail: { icon: '✕', word: 'fail', className: 'text-madder' },
  'not-judged': { icon: '–', word: 'not judged', className: 'text-ink-soft' },
} as const;

const GROUPS: [Finding['group'], string][] = [
  ['boundary', 'Boundary'],
  ['resolution', 'Resolution'],
  ['quality', 'Element quality'],
  ['matrices', 'Matrices'],
  ['validity', 'Validity'],
];

/** The server's judgement of the design, and the way to a version. */
export const CheckPanel = memo(({ check, isOld, isReadOnly, onCheck, onCancel, onSave }: CheckPanelProps) => {
  const { job, result } = check;
  const isRunning = job !== null && (job.state === 'queued' || job.state === 'running');
  return (
    <section aria-label="Check" className="flex flex-col gap-3 px-4 py-3">
      <div className="flex flex-wrap gap-2">
        <button type="button" className={`${BUTTON} flex-1`} disabled={isRunning || isReadOnly} onClick={onCheck}>Check</button>
        <button type="button" className={`${PRIMARY} flex-1`} disabled={isReadOnly} onClick={onSave}>Save version…</button>
      </div>
      {isRunning && <Progress phase={job.state === 'queued' ? 'waiting for a worker' : job.progress.phase} fraction={job.progress.fraction} startedAt={check.startedAt || Date.parse(job.createdAt)} onCancel={onCancel} />}
      {job?.state === 'cancelled' && <p role="status" className="font-prose text-sm text-ink">The check was cancelled. {result ? 'The findings below are of the check before.' : 'Nothing was changed.'}</p>}
      {check.problem && <p role="alert" className="border-l-4 border-madder bg-madder-wash px-3 py-2 font-prose text-sm text-ink">{check.problem}</p>}
      {!result && !isRunning && !check.problem && (
        <p className="font-prose text-sm text-ink-soft">The server rebuilds the mesh from the recipe, assembles its matrices and judges both. Not checked yet.</p>
      )}
      {result && isOld && (
        <p role="status" className="border-l-4 border-weld bg-weld-wash px-3 py-2 font-prose text-sm text-ink">The design has changed since this check. Check again before you save a version.</p>
      )}
      {result && <Findings findings={result.findings} canShow={!isOld} />}
    </section>
  );
});
CheckPanel.displayName = 'CheckPanel';

interface ProgressProps {
  phase: string;
  fraction: number;
  startedAt: number;
  onCancel(): void;
}

export const Progress = ({ phase, fraction, startedAt, onCancel }: ProgressProps) => {
  const [now, setNow] = useState(() => Date.now());
  useEffect(() => {
    const timer = setInterval(() => setNow(Date.now()), 1000);
    return () => clearInterval(timer);
  }, []);
  return (
    <div className="flex flex-col gap-1.5">
      <div className="flex items-baseline justify-between gap-2 font-mono text-xs text-ink">
        <span>{phase}</span>
        <span className="text-ink-soft tabular-nums">{formatElapsed((now - startedAt) / 1000)}</span>
      </div>
      <div role="progressbar" aria-label="Check" aria-valuenow={Math.round(100 * fraction)} aria-valuemin={0} aria-valuemax={100} className="h-2 border border-line-strong bg-linen-sunk">
        <div className="h-full bg-woad" style={{ width: `${100 * fraction}%` }} />
      </div>
      <button type="button" className={BUTTON} onClick={onCancel}>Cancel</button>
    </div>
  );
};

const Findings = ({ findings, canShow }: { findings: Finding[]; canShow: boolean }) => {
  const count = (verdict: Finding['verdict']): number => findings.filter((finding) => finding.verdict === verdict).length;
  return (
    <div className="flex flex-col gap-3" data-testid="findings">
      <p role="status" className="font-mono text-sm text-ink">
        {(['fail', 'warn', 'pass'] as const).map((verdict) => (
          <span key={verdict} className="mr-4 whitespace-nowrap">
            <span aria-hidden="true" className={VERDICTS[verdict].className}>{VERDICTS[verdict].icon}</span> {count(verdict)} {verdict}
          </span>
        ))}
      </p>
      {GROUPS.map(([group, title]) => {
        const own = findings.filter((finding) => finding.group === group);
        if (own.length === 0) return null;
        return (
          <section key={group} aria-label={title}>
            <h3 className="border-b border-line pb-1 font-mono text-xs font-semibold text-ink">{title}</h3>
            <ul className="flex flex-col">
              {own.map((finding) => <FindingRow key={finding.id} finding={finding} canShow={canShow} />)}
            </ul>
          </section>
        );
      })}
    </div>
  );
};

const withUnit = (value: number, unit: string): string => `${Number.isInteger(value) ? formatCount(value) : Math.abs(value) < 1e-4 ? value.toExponential(1) : formatNumber(value)}${unit === '' ? '' : unit === 'deg' ? '°' : ` ${unit}`}`;

const limitWords = ({ limit, unit }: Finding): string => {
  const side = limit.direction === 'above' ? 'above' : 'below';
  const parts = [limit.warn !== null && `warns ${side} ${withUnit(limit.warn, unit)}`, limit.fail !== null && `fails ${side} ${withUnit(limit.fail, unit)}`].filter(Boolean);
  return parts.join(', ');
};

const FindingRow = ({ finding, canShow }: { finding: Finding; canShow: boolean }) => {
  const { icon, word, className } = VERDICTS[finding.verdict];
  return (
    <li className="border-b border-line">
      <details open={finding.verdict === 'fail'}>
        <summary className="grid cursor-pointer list-none grid-cols-[5.5rem_1fr_auto] items-baseline gap-2 py-1.5 font-mono text-xs text-ink hover:bg-linen-sunk focus-visible:outline-2 focus-visible:outline-woad">
          <span className={className}>
            <span aria-hidden="true">{icon}</span> {word}
          </span>
          <span>{finding.title}</span>
          <span className="text-right tabular-nums">{finding.value === null ? '' : withUnit(finding.value, finding.unit)}</span>
        </summary>
        <div className="flex flex-col gap-1.5 pb-2.5 pl-[5.5rem]">
          <p className="font-prose text-sm text-ink">{finding.explanation}</p>
          <p className="font-mono text-[0.6875rem] text-ink-soft">{[limitWords(finding), finding.source].filter((text) => text !== '').join('. ')}</p>
          {finding.placeCount > 0 && (
            <button type="button" className={`${BUTTON} self-start`} disabled={!canShow} title={canShow ? undefined : 'The mesh on the map is another one by now'} onClick={() => showPlace(finding.place)}>
              Show me {finding.placeCount > 1 ? `(${formatCount(finding.placeCount)})` : ''}
              <span className="sr-only"> {finding.title}</span>
            </button>
          )}
        </div>
      </details>
    </li>
  );
};
