import { type FormEvent, useState } from 'react';

import { sendJson } from '#client/api/fetch.ts';
import { Field } from '#components/ui/Field.tsx';
import { Message } from '#components/ui/Message.tsx';
import { useSubmit } from '#components/ui/use-submit.ts';
import type { Design } from '#schemas/designs.ts';

interface NewDesignFormProps {
  studyId: string;
  sets: { id: string; name: string }[];
}

/** Starts a design on an observation set, from the recipe that the server proposes. */
export const NewDesignForm = ({ studyId, sets }: NewDesignFormProps) => {
  const [name, setName] = useState('');
  const [observationSetId, setSet] = useState(sets[0]?.id ?? '');
  const submit = useSubmit();
  const handleSubmit = async (event: FormEvent) => {
    event.preventDefault();
    await submit.run(async () => location.assign(`/designs/${(await sendJson<Design>('POST', `/api/v1/studies/${studyId}/designs`, { name, observationSetId })).id}`));
  };
  return (
    <form onSubmit={handleSubmit} className="grid gap-3" noValidate>
      {submit.failure && <Message kind="fail">{submit.failure}</Message>}
      <div className="flex flex-wrap items-end gap-3">
        <div className="min-w-56 flex-1">
          <Field label="Name of the new design" error={submit.fieldError('name')}>
            {(attributes) => <input {...attributes} className="input" value={name} maxLength={120} onChange={(e) => setName(e.target.value)} />}
          </Field>
        </div>
        {sets.length > 1 && (
          <div className="min-w-56">
            <Field label="On observation set">
              {(attributes) => (
                <select {...attributes} className="input" value={observationSetId} onChange={(e) => setSet(e.target.value)}>
                  {sets.map((set) => (
                    <option key={set.id} value={set.id}>
                      {set.name}
                    </option>
                  ))}
                </select>
              )}
            </Field>
          </div>
        )}
        <button className="btn btn-primary" disabled={submit.isSending || name.trim() === ''}>
          {submit.isSending ? 'Preparing …' : 'New design'}
        </button>
      </div>
    </form>
  );
};
