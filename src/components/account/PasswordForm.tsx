import { type FormEvent, useState } from 'react';

import { sendJson } from '#client/api/fetch.ts';
import { Field } from '#components/ui/Field.tsx';
import { Message } from '#components/ui/Message.tsx';
import { useSubmit } from '#components/ui/use-submit.ts';

/** Changes the password; `isFirst` while a one-time password is in force. */
export const PasswordForm = ({ isFirst }: { isFirst: boolean }) => {
  const [currentPassword, setCurrent] = useState('');
  const [newPassword, setNew] = useState('');
  const [again, setAgain] = useState('');
  const [isDone, setDone] = useState(false);
  const submit = useSubmit();
  const differs = again !== '' && again !== newPassword;
  const handleSubmit = async (event: FormEvent) => {
    event.preventDefault();
    if (again !== newPassword) return;
    setDone(false);
    if (!(await submit.run(() => sendJson('PUT', '/api/v1/me/password', { currentPassword, newPassword })))) return;
    if (isFirst) {
      location.assign('/');
      return;
    }
    setDone(true);
    setCurrent('');
    setNew('');
    setAgain('');
  };
  return (
    <form onSubmit={handleSubmit} className="grid max-w-md gap-4" noValidate>
      {isDone && <Message kind="pass">The password is changed. All your other sessions have ended.</Message>}
      {submit.failure && <Message kind="fail">{submit.failure}</Message>}
      <Field label={isFirst ? 'One-time password' : 'Current password'} error={submit.fieldError('currentPassword')}>
        {(attributes) => <input {...attributes} className="input" type="password" autoComplete="current-password" value={currentPassword} onChange={(e) => setCurrent(e.target.value)} />}
      </Field>
      <Field label="New password" hint="At least 12 characters." error={submit.fieldError('newPassword')}>
        {(attributes) => <input {...attributes} className="input" type="password" autoComplete="new-password" value={newPassword} onChange={(e) => setNew(e.target.value)} />}
      </Field>
      <Field label="New password again" error={differs ? 'This differs from the new password.' : undefined}>
        {(attributes) => <input {...attributes} className="input" type="password" autoComplete="new-password" value={again} onChange={(e) => setAgain(e.target.value)} />}
      </Field>
      <button className="btn btn-primary justify-self-start" disabled={submit.isSending || differs || newPassword === ''}>
        {submit.isSending ? 'Changing …' : 'Change password'}
      </button>
    </form>
  );
};
