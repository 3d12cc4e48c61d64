import { type FormEvent, useState } from 'react';

import { sendJson } from '#client/api/fetch.ts';
import { Field } from '#components/ui/Field.tsx';
import { Message } from '#components/ui/Message.tsx';
import { useSubmit } from '#components/ui/use-submit.ts';

/** Sign-in; `next` is where the person wanted to go. */
export const SignInForm = ({ next }: { next: string }) => {
  const [email, setEmail] = useState('');
  const [password, setPassword] = useState('');
  const submit = useSubmit();
  const handleSubmit = async (event: FormEvent) => {
    event.preventDefault();
    if (await submit.run(() => sendJson('POST', '/api/v1/session', { email, password }))) location.assign(next);
  };
  return (
    <form onSubmit={handleSubmit} className="grid gap-4" noValidate>
      {submit.failure && <Message kind="fail">{submit.failure}</Message>}
      <Field label="E-mail" error={submit.fieldError('email')}>
        {(attributes) => <input {...attributes} className="input" type="email" autoComplete="username" required value={email} onChange={(e) => setEmail(e.target.value)} />}
      </Field>
      <Field label="Password" error={submit.fieldError('password')}>
        {(attributes) => <input {...attributes} className="input" type="password" autoComplete="current-password" required value={password} onChange={(e) => setPassword(e.target.value)} />}
      </Field>
      <button className="btn btn-primary" disabled={submit.isSending}>
        {submit.isSending ? 'Signing in …' : 'Sign in'}
      </button>
    </form>
  );
};
