import { useEffect, useId, useRef, useState } from 'react';

import type { SessionState } from '#client/design/design-session.ts';
import type { Finding } from '#schemas/findings.ts';

import { BUTTON, PRIMARY } from './fields.tsx';

interface SaveVersionDialogProps {
  /** Findings of a check of exactly this design; null: the server checks while it saves. */
  findings: Finding[] | null;
  saving: SessionState['saving'];
  onSave(note: string, reason: string): void;
  onClose(): void;
}

/** Freezes the design as a numbered version; a failing finding needs a reason, which is kept. */
export const SaveVersionDialog = ({ findings, saving, onSave, onClose }: SaveVersionDialogProps) => {
  const id = useId();
  const dialog = useRef<HTMLDialogElement>(null);
  const [note, setNote] = useState('');
  const [reason, setReason] = useState('');
  useEffect(() => dialog.current?.showModal(), []);
  const failing = findings?.filter((finding) => finding.verdict === 'fail') ?? [];
  const isRunning = saving.job !== null && saving.problem === null && saving.versionId === null && saving.job.state !== 'cancelled';
  const wasRefused = saving.problem !== null;
  const asksReason = failing.length > 0 || wasRefused;
  const isBlocked = isRunning || (failing.length > 0 && reason.trim() === '');
  return (
    <dialog ref={dialog} aria-labelledby={`${id}-title`} onClose={onClose} className="m-auto w-[min(34rem,calc(100vw-2rem))] border border-line-strong bg-linen p-0 text-ink backdrop:bg-ink/40">
      {saving.versionId ? (
        <div className="flex flex-col gap-4 p-5">
          <h2 id={`${id}-title`} className="font-mono text-base font-semibold">Version saved</h2>
          <p className="font-prose">It cannot change any more: recipe, mesh, findings and hash are kept together.</p>
          <div className="flex justify-end gap-2">
            <button type="button" className={BUTTON} onClick={() => dialog.current?.close()}>Go on designing</button>
            <a className={PRIMARY} href={`/versions/${saving.versionId}`}>Open the version</a>
          </div>
        </div>
      ) : (
        <form
          className="flex flex-col gap-4 p-5"
          onSubmit={(event) => {
            event.preventDefault();
            if (!isBlocked) onSave(note, reason);
          }}
        >
          <h2 id={`${id}-title`} className="font-mono text-base font-semibold">Save a version</h2>
          {failing.length > 0 && (
            <div className="border-l-4 border-madder bg-madder-wash px-3 py-2">
              <p className="font-prose">{failing.length === 1 ? 'One finding fails' : `${failing.length} findings fail`}. The version is saved only with a reason, which stays with it.</p>
              <ul className="mt-1 font-mono text-xs">
                {failing.map((finding) => <li key={finding.id}><span aria-hidden="true" className="text-madder">✕</span> {finding.title}</li>)}
              </ul>
            </div>
          )}
          {findings === null && <p className="font-prose text-ink-soft">The design has not been checked in this state. The server checks it first, and refuses when a finding fails and no reason is given.</p>}
          <TextArea id={`${id}-note`} label="Note" hint="What this version is for. Optional." value={note} onChange={setNote} />
          {asksReason && <TextArea id={`${id}-reason`} label="Reason to save although findings fail" hint="" value={reason} isRequired={failing.length > 0} onChange={setReason} />}
          {saving.problem && <p role="alert" className="border-l-4 border-madder bg-madder-wash px-3 py-2 font-prose text-sm">{saving.problem}</p>}
          {isRunning && <p role="status" className="font-mono text-xs">{saving.job?.state === 'queued' ? 'waiting for a worker' : saving.job?.progress.phase} … {Math.round(100 * (saving.job?.progress.fraction ?? 0))} %</p>}
          <div className="flex justify-end gap-2">
            <button type="button" className={BUTTON} onClick={() => dialog.current?.close()}>Close</button>
            <button type="submit" className={PRIMARY} disabled={isBlocked}>Save version</button>
          </div>
        </form>
      )}
    </dialog>
  );
};

interface TextAreaProps {
  id: string;
  label: string;
  hint: string;
  value: string;
  isRequired?: boolean;
  onChange(text: string): void;
}

const TextArea = ({ id, label, hint, value, isRequired, onChange }: TextAreaProps) => (
  <div className="flex flex-col gap-1">
    <label htmlFor={id} className="font-mono text-xs">{label}</label>
    <textarea id={id} rows={3} maxLength={2000} required={isRequired} value={value} className="border border-line-strong bg-linen-raised px-2 py-1 font-prose text-ink focus-visible:outline-2 focus-visible:outline-woad" onChange={({ target }) => onChange(target.value)} />
    {hint && <p className="font-prose text-sm text-ink-soft">{hint}</p>}
  </div>
);
