import type { DesignSession, SessionState } from '#client/design/design-session.ts';
import { formatNumber } from '#client/design/words.ts';

import { BUTTON } from './fields.tsx';

interface DesignBarProps {
  state: SessionState;
  session: DesignSession;
  isReadOnly: boolean;
}

/** Undo, redo, and what is saved. */
export const DesignBar = ({ state, session, isReadOnly }: DesignBarProps) => {
  const history = state.history!;
  return (
    <div className="flex min-h-11 flex-wrap items-center gap-2 border-b border-line px-4 py-1.5">
      {!isReadOnly && (
        <>
          <button type="button" className={BUTTON} disabled={history.past.length === 0} aria-keyshortcuts="Control+Z" title="Ctrl+Z" onClick={() => session.undo()}>↶ Undo</button>
          <button type="button" className={BUTTON} disabled={history.future.length === 0} aria-keyshortcuts="Control+Shift+Z" title="Ctrl+Shift+Z" onClick={() => session.redo()}>↷ Redo</button>
        </>
      )}
      <p role="status" data-testid="save-state" className="font-mono text-xs text-ink">{isReadOnly ? 'You can look at this design but not change it.' : saveWords(state)}</p>
      <p className="ml-auto font-mono text-xs text-ink-soft tabular-nums">{state.isBuilding ? 'building the mesh …' : state.result ? `mesh built in ${formatNumber(state.result.milliseconds, 2)} ms` : ''}</p>
    </div>
  );
};

const saveWords = ({ save, design }: SessionState): string => {
  switch (save.kind) {
    case 'saved':
      return `✓ saved, revision ${design!.revision}`;
    case 'waiting':
    case 'saving':
      return '… saving';
    case 'conflict':
      return '▲ not saved because somebody else saved a newer version; both are kept';
    case 'failed':
      return `✕ not saved because: ${save.reason}`;
  }
};
