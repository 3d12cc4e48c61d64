import { useState } from 'react';

import { sendJson } from '#client/api/fetch.ts';
import { useSubmit } from '#components/ui/use-submit.ts';

interface DeleteButtonProps {
  /** API address of what goes. */
  path: string;
  /** "this study with its observation sets and designs" */
  what: string;
  next: string;
}

/** Deletes something after asking once. */
export const DeleteButton = ({ path, what, next }: DeleteButtonProps) => {
  const [isAsking, setAsking] = useState(false);
  const submit = useSubmit();
  const handleDelete = async () => {
    if (await submit.run(() => sendJson('DELETE', path))) location.assign(next);
  };
  return (
    <div>
      {isAsking ? (
        <div className="flex flex-wrap items-center gap-3">
          <span>Delete {what} for good?</span>
          <button type="button" className="btn btn-danger btn-small" onClick={handleDelete} disabled={submit.isSending}>
            Delete
          </button>
          <button type="button" className="btn btn-small" onClick={() => setAsking(false)}>
            Keep
          </button>
        </div>
      ) : (
        <button type="button" className="btn btn-small" onClick={() => setAsking(true)}>
          Delete …
        </button>
      )}
      {submit.failure && <p className="field-error mt-2">{submit.failure}</p>}
    </div>
  );
};
