import type { ReactNode } from 'react';

/** What happened, told to the person; failures interrupt a screen reader, the rest wait. */
export const Message = ({ kind, children }: { kind: 'fail' | 'warn' | 'pass' | 'note'; children: ReactNode }) => (
  <div className={`message ${kind === 'note' ? '' : `message-${kind}`}`} role={kind === 'fail' ? 'alert' : 'status'}>
    {children}
  </div>
);
