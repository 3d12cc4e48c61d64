import { useEffect, useState, useSyncExternalStore } from 'react';

import type { DesignSession, SessionState } from '#client/design/design-session.ts';
import { createDesignSession } from '#client/design/design-session.ts';

/** The session of a design for as long as the component lives. */
export const useSession = (designId: string): { session: DesignSession; state: SessionState } | null => {
  const [session, setSession] = useState<DesignSession | null>(null);
  useEffect(() => {
    const made = createDesignSession(designId);
    setSession(made);
    return () => made.destroy();
  }, [designId]);
  const state = useSyncExternalStore(session?.subscribe ?? subscribeToNothing, () => session?.getState() ?? null, () => null);
  return session && state ? { session, state } : null;
};

const subscribeToNothing = () => () => {};
