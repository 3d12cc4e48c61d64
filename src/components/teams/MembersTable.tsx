import { type FormEvent, useState } from 'react';

import { sendJson } from '#client/api/fetch.ts';
import { formatTime } from '#client/format.ts';
import { Field } from '#components/ui/Field.tsx';
import { Message } from '#components/ui/Message.tsx';
import { useSubmit } from '#components/ui/use-submit.ts';
import type { AddedMember, Member, Role } from '#schemas/people.ts';

const ROLE_WORDS: Record<Role, string> = {
  viewer: 'viewer: reads and downloads',
  designer: 'designer: also uploads, designs, checks and saves versions',
  reviewer: 'reviewer: also reviews versions',
  admin: 'admin: also manages people',
};
const ROLES = Object.keys(ROLE_WORDS) as Role[];

interface MembersTableProps {
  teamId: string;
  members: Member[];
  canManage: boolean;
  myUserId: string;
}

/** Everybody in the team; administrators add and remove people and change roles. */
export const MembersTable = ({ teamId, members: first, canManage, myUserId }: MembersTableProps) => {
  const [members, setMembers] = useState(first);
  const [removing, setRemoving] = useState<string | null>(null);
  const submit = useSubmit();
  const path = `/api/v1/teams/${teamId}/members`;

  const handleRole = (userId: string, role: Role) =>
    submit.run(async () => {
      const changed = await sendJson<Member>('PATCH', `${path}/${userId}`, { role });
      setMembers((list) => list.map((member) => (member.userId === userId ? changed : member)));
    });
  const handleRemove = (userId: string) =>
    submit.run(async () => {
      await sendJson('DELETE', `${path}/${userId}`);
      setRemoving(null);
      if (userId === myUserId) location.assign('/');
      else setMembers((list) => list.filter((member) => member.userId !== userId));
    });

  return (
    <div className="grid gap-8">
      {submit.failure && <Message kind="fail">{submit.failure}</Message>}
      <div className="overflow-x-auto" tabIndex={0} role="region" aria-label="Members">
        <table className="table">
          <thead>
            <tr>
              <th scope="col">Name</th>
              <th scope="col">E-mail</th>
              <th scope="col">Role</th>
              <th scope="col" className="num">In the team since</th>
              {canManage && <th scope="col"><span className="sr-only">Remove</span></th>}
            </tr>
          </thead>
          <tbody>
            {members.map((member) => (
              <tr key={member.userId}>
                <td>{member.name}</td>
                <td>{member.email}</td>
                <td>
                  {canManage ? (
                    <select aria-label={`Role of ${member.name}`} className="input min-w-28" value={member.role} disabled={submit.isSending} onChange={(e) => void handleRole(member.userId, e.target.value as Role)}>
                      {ROLES.map((role) => (
                        <option key={role}>{role}</option>
                      ))}
                    </select>
                  ) : (
                    member.role
                  )}
                </td>
                <td className="num">{formatTime(member.joinedAt).slice(0, 10)}</td>
                {canManage && (
                  <td className="num">
                    {removing === member.userId ? (
                      <span className="inline-flex gap-2">
                        <button type="button" className="btn btn-small btn-danger" disabled={submit.isSending} onClick={() => void handleRemove(member.userId)}>
                          Remove for good
                        </button>
                        <button type="button" className="btn btn-small" onClick={() => setRemoving(null)}>
                          Keep
                        </button>
                      </span>
                    ) : (
                      <button type="button" className="btn btn-small" aria-label={`Remove ${member.name}`} onClick={() => setRemoving(member.userId)}>
                        Remove
                      </button>
                    )}
                  </td>
                )}
              </tr>
            ))}
          </tbody>
        </table>
      </div>
      {canManage && <AddMember path={path} onAdded={(member) => setMembers((list) => [...list, member])} />}
    </div>
  );
};

const AddMember = ({ path, onAdded }: { path: string; onAdded: (member: Member) => void }) => {
  const [email, setEmail] = useState('');
  const [name, setName] = useState('');
  const [role, setRole] = useState<Role>('designer');
  const [added, setAdded] = useState<AddedMember | null>(null);
  const submit = useSubmit();
  const handleSubmit = async (event: FormEvent) => {
    event.preventDefault();
    await submit.run(async () => {
      const member = await sendJson<AddedMember>('POST', path, { email, name, role });
      setAdded(member);
      onAdded(member);
      setEmail('');
      setName('');
    });
  };
  return (
    <section aria-labelledby="add-member" className="section">
      <h2 id="add-member" className="mb-4">Add a person</h2>
      {added && (
        <div className="mb-4">
          <Message kind="pass">
            {added.name} is in the team.{' '}
            {added.oneTimePassword ? (
              <>
                One-time password, shown only now: <code className="font-bold select-all">{added.oneTimePassword}</code>. Hand it over yourself; it must be changed at the first sign-in.
              </>
            ) : (
              'They had an account already and sign in as before.'
            )}
          </Message>
        </div>
      )}
      {submit.failure && (
        <div className="mb-4">
          <Message kind="fail">{submit.failure}</Message>
        </div>
      )}
      <form onSubmit={handleSubmit} className="grid max-w-3xl gap-4 sm:grid-cols-2" noValidate>
        <Field label="Name" error={submit.fieldError('name')}>
          {(attributes) => <input {...attributes} className="input" autoComplete="off" value={name} onChange={(e) => setName(e.target.value)} />}
        </Field>
        <Field label="E-mail" error={submit.fieldError('email')}>
          {(attributes) => <input {...attributes} className="input" type="email" autoComplete="off" value={email} onChange={(e) => setEmail(e.target.value)} />}
        </Field>
        <Field label="Role">
          {(attributes) => (
            <select {...attributes} className="input" value={role} onChange={(e) => setRole(e.target.value as Role)}>
              {ROLES.map((one) => (
                <option key={one} value={one}>
                  {ROLE_WORDS[one]}
                </option>
              ))}
            </select>
          )}
        </Field>
        <div className="flex items-end">
          <button className="btn btn-primary" disabled={submit.isSending}>
            Add to the team
          </button>
        </div>
      </form>
    </section>
  );
};
