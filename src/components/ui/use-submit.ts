import { useState } from 'react';

import { ApiError } from '#client/api/fetch.ts';

export interface Submit {
  isSending: boolean;
  /** What failed as a whole, in a sentence. */
  failure: string | null;
  /** What is wrong with a field. */
  fieldError(path: string): string | undefined;
  /** Runs the request; the form stays disabled meanwhile. Returns whether it went through. */
  run(work: () => Promise<void>): Promise<boolean>;
}

/** State of a form that is sent to the API. */
export const useSubmit = (): Submit => {
  const [isSending, setSending] = useState(false);
  const [error, setError] = useState<unknown>(null);
  return {
    isSending,
    failure: error === null ? null : error instanceof Error ? error.message : String(error),
    fieldError: (path) => (error instanceof ApiError ? error.fieldMessage(path) : undefined),
    run: async (work) => {
      setSending(true);
      setError(null);
      try {
        await work();
        return true;
      } catch (cause) {
        setError(cause);
        return false;
      } finally {
        setSending(false);
      }
    },
  };
};
