import { useState } from 'react';

import type { Draft } from '#client/design/design-api.ts';
import { draftRows } from '#client/design/draft-rows.ts';
import type { Design } from '#schemas/designs.ts';

import { BUTTON } from './fields.tsx';

interface ConflictPanelProps {
  mine: Draft;
  theirs: Design;
  onChoose(choice: 'mine' | 'theirs' | 'new', name?: string): void;
}

/** Both versions of a design that two people changed, side by side, and the ways out. */
export const ConflictPanel = ({ mine, theirs, onChoose }: ConflictPanelProps) => {
  const [name, setName] = useState(`${theirs.name} (mine)`);
  const rows = draftRows(mine, theirs);
  return (
    <section role="alertdialog" aria-label="Two people changed this design" className="border-b-2 border-weld bg-weld-wash px-4 py-3 text-ink">
      <h2 className="font-mono text-sm font-semibold">{theirs.updatedBy.name} saved this design while you changed it</h2>
      <p className="mt-1 font-prose text-sm">Nothing was overwritten: both versions are kept until you choose. Yours is on the map.</p>
      <div className="mt-2 overflow-x-auto" tabIndex={0} role="group" aria-label="Differences">
        <table className="font-mono text-xs tabular-nums">
          <thead>
            <tr className="text-left">
              <th scope="col" className="py-1 pr-6 font-semibold">Differs in</th>
              <th scope="col" className="py-1 pr-6 font-semibold">Yours</th>
              <th scope="col" className="py-1 font-semibold">{theirs.updatedBy.name}, revision {theirs.revision}</th>
            </tr>
          </thead>
          <tbody>
            {rows.map(({ label, mine: own, theirs: other }) => (
              <tr key={label} className="border-t border-line-strong">
                <th scope="row" className="py-1 pr-6 text-left font-normal">{label}</th>
                <td className="max-w-64 py-1 pr-6 break-words">{own}</td>
                <td className="max-w-64 py-1 break-words">{other}</td>
              </tr>
            ))}
          </tbody>
        </table>
      </div>
      <div className="mt-3 flex flex-wrap items-end gap-2">
        <button type="button" className={BUTTON} onClick={() => onChoose('theirs')}>Take theirs (undo brings mine back)</button>
        <button type="button" className={BUTTON} onClick={() => onChoose('mine')}>Keep mine, as the next revision</button>
        <label className="flex flex-col gap-1 font-mono text-xs">
          Name of a new design
          <input className="h-8 border border-line-strong bg-linen-raised px-2 font-mono text-xs focus-visible:outline-2 focus-visible:outline-woad" value={name} maxLength={120} onChange={({ target }) => setName(target.value)} />
        </label>
        <button type="button" className={BUTTON} disabled={name.trim() === ''} onClick={() => onChoose('new', name.trim())}>Save mine as a new design</button>
      </div>
    </section>
  );
};
