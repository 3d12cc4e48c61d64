import { type FormEvent, useState } from 'react';

import { sendJson } from '#client/api/fetch.ts';
import { Field } from '#components/ui/Field.tsx';
import { Message } from '#components/ui/Message.tsx';
import { useSubmit } from '#components/ui/use-submit.ts';
import type { Team } from '#schemas/people.ts';

/** Makes a team whose administrator is the signed-in person. */
export const NewTeamForm = () => {
  const [name, setName] = useState('');
  const submit = useSubmit();
  const handleSubmit = async (event: FormEvent) => {
    event.preventDefault();
    await submit.run(async () => location.assign(`/teams/${(await sendJson<Team>('POST', '/api/v1/teams', { name })).id}`));
  };
  return (
    <form onSubmit={handleSubmit} className="grid max-w-md gap-4" noValidate>
      {submit.failure && <Message kind="fail">{submit.failure}</Message>}
      <Field label="Name of the team" error={submit.fieldError('name')}>
        {(attributes) => <input {...attributes} className="input" value={name} maxLength={100} onChange={(e) => setName(e.target.value)} />}
      </Field>
      <button className="btn btn-primary justify-self-start" disabled={submit.isSending || name.trim() === ''}>
        Create team
      </button>
    </form>
  );
};
