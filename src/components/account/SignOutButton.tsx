import { sendJson } from '#client/api/fetch.ts';
import { useSubmit } from '#components/ui/use-submit.ts';

/** Ends the session and goes to the sign-in page. */
export const SignOutButton = () => {
  const submit = useSubmit();
  const handleClick = async () => {
    if (await submit.run(() => sendJson('DELETE', '/api/v1/session'))) location.assign('/sign-in');
  };
  return (
    <>
      <button type="button" className="btn" onClick={handleClick} disabled={submit.isSending}>
        Sign out
      </button>
      {submit.failure && <p className="field-error mt-2">{submit.failure}</p>}
    </>
  );
};
