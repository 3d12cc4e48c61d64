import { type FormEvent, useState } from 'react';

import { sendJson } from '#client/api/fetch.ts';
import { formatKm } from '#client/format.ts';
import { Field } from '#components/ui/Field.tsx';
import { Message } from '#components/ui/Message.tsx';
import { useSubmit } from '#components/ui/use-submit.ts';
import { resolveScale } from '#core/correlation/scale.ts';
import type { Correlation } from '#schemas/correlation.ts';
import type { Study } from '#schemas/studies.ts';

interface StudyFormProps {
  teamId: string;
  /** Absent: a new study. */
  study?: Study;
}

interface Draft {
  kind: 'scalar' | 'vector';
  lengthKind: 'daley' | 'scale';
  length: string;
  steps: string;
  tolerance: string;
  mass: Correlation['mass'];
  normalisation: Correlation['normalisation'];
  rotationalShare: string;
  sphereRadiusKm: string;
}

const draftOf = (correlation: Correlation | undefined): Draft => ({
  kind: correlation?.kind ?? 'scalar',
  lengthKind: correlation?.scaleKm !== undefined ? 'scale' : 'daley',
  length: String(correlation?.daleyKm ?? correlation?.scaleKm ?? 100),
  steps: String(correlation?.steps ?? 4),
  tolerance: String(100 * (correlation?.tolerance ?? 0.01)),
  mass: correlation?.mass ?? 'consistent',
  normalisation: correlation?.normalisation ?? 'exact',
  rotationalShare: String(correlation?.rotationalShare ?? 0.5),
  sphereRadiusKm: String(correlation?.sphereRadiusKm ?? 6371),
});

const modelOf = (draft: Draft, correlatedShare: number | undefined) => ({
  kind: draft.kind,
  ...(draft.lengthKind === 'daley' ? { daleyKm: Number(draft.length) } : { scaleKm: Number(draft.length) }),
  steps: Number(draft.steps),
  mass: draft.mass,
  normalisation: draft.normalisation,
  tolerance: Number(draft.tolerance) / 100,
  ...(draft.kind === 'vector' && { rotationalShare: Number(draft.rotationalShare) }),
  ...(correlatedShare !== undefined && { correlatedShare }),
  sphereRadiusKm: Number(draft.sphereRadiusKm),
});

/** The other length, computed from the one given, in words. */
const otherLength = (draft: Draft): string => {
  const length = Number(draft.length);
  const steps = Number(draft.steps);
  if (!(length > 0) || !(steps >= 2)) return '';
  try {
    const { scaleKm, daleyKm } = resolveScale(draft.lengthKind === 'daley' ? { daleyKm: length, steps } : { scaleKm: length, steps });
    return draft.lengthKind === 'daley' ? `Diffusion scale l = ${formatKm(scaleKm, 4)}.` : daleyKm ? `Daley length D = ${formatKm(daleyKm, 4)}.` : 'With 2 steps the Daley length is zero.';
  } catch {
    return '';
  }
};

/** Name, description and correlation model of a study. */
export const StudyForm = ({ teamId, study }: StudyFormProps) => {
  const [name, setName] = useState(study?.name ?? '');
  const [description, setDescription] = useState(study?.description ?? '');
  const [draft, setDraft] = useState(() => draftOf(study?.correlation));
  const submit = useSubmit();
  const set = <K extends keyof Draft>(key: K, value: Draft[K]) => setDraft((old) => ({ ...old, [key]: value }));
  const error = (...keys: string[]): string | undefined => keys.map((key) => submit.fieldError(`correlation.${key}`)).find(Boolean);

  const handleSubmit = async (event: FormEvent) => {
    event.preventDefault();
    const body = { name, description, correlation: modelOf(draft, study?.correlation.correlatedShare) };
    await submit.run(async () => {
      const saved = study ? await sendJson<Study>('PATCH', `/api/v1/studies/${study.id}`, body) : await sendJson<Study>('POST', `/api/v1/teams/${teamId}/studies`, body);
      location.assign(`/studies/${saved.id}`);
    });
  };

  return (
    <form onSubmit={handleSubmit} className="grid max-w-3xl gap-5" noValidate>
      {submit.failure && <Message kind="fail">{submit.failure}</Message>}
      <Field label="Name" error={submit.fieldError('name')}>
        {(attributes) => <input {...attributes} className="input" value={name} maxLength={120} onChange={(e) => setName(e.target.value)} />}
      </Field>
      <Field label="Description" hint="What is observed, and what the mesh is for." error={submit.fieldError('description')}>
        {(attributes) => <textarea {...attributes} className="input min-h-20" value={description} maxLength={2000} onChange={(e) => setDescription(e.target.value)} />}
      </Field>
      <fieldset className="grid gap-5 border-t border-line pt-5 sm:grid-cols-2">
        <legend className="sr-only">Correlation model</legend>
        <h2 className="sm:col-span-2">Correlation model</h2>
        <Field label="Observed quantity" hint={draft.kind === 'vector' ? 'Two components such as u and v, from a stream function and a velocity potential.' : 'One number at each place.'}>
          {(attributes) => (
            <select {...attributes} className="input" value={draft.kind} onChange={(e) => set('kind', e.target.value as Draft['kind'])}>
              <option value="scalar">scalar</option>
              <option value="vector">two components</option>
            </select>
          )}
        </Field>
        <Field label="Implicit steps m" hint="2 to 20. More steps make the correlation function smoother, nearer to a Gaussian." error={error('steps')}>
          {(attributes) => <input {...attributes} className="input text-right" inputMode="numeric" value={draft.steps} onChange={(e) => set('steps', e.target.value)} />}
        </Field>
        <Field label="Length given as">
          {(attributes) => (
            <select {...attributes} className="input" value={draft.lengthKind} onChange={(e) => set('lengthKind', e.target.value as Draft['lengthKind'])}>
              <option value="daley">Daley length D</option>
              <option value="scale">diffusion scale l</option>
            </select>
          )}
        </Field>
        <Field label={draft.lengthKind === 'daley' ? 'Daley length D, km' : 'Diffusion scale l, km'} hint={otherLength(draft)} error={error('daleyKm', 'scaleKm')}>
          {(attributes) => <input {...attributes} className="input text-right" inputMode="decimal" value={draft.length} onChange={(e) => set('length', e.target.value)} />}
        </Field>
        <Field
          label="Normalisation in the receiving code"
          hint={draft.normalisation === 'exact' ? 'By the exact diagonal: the boundary can change correlations only.' : 'By theory: the boundary changes the variance itself.'}
        >
          {(attributes) => (
            <select {...attributes} className="input" value={draft.normalisation} onChange={(e) => set('normalisation', e.target.value as Draft['normalisation'])}>
              <option value="exact">exact diagonal</option>
              <option value="theory">theoretical γ²</option>
            </select>
          )}
        </Field>
        <Field label="Tolerance, %" hint="How much the boundary may change variance or correlation at any observation." error={error('tolerance')}>
          {(attributes) => <input {...attributes} className="input text-right" inputMode="decimal" value={draft.tolerance} onChange={(e) => set('tolerance', e.target.value)} />}
        </Field>
        <Field label="Mass matrix" hint={draft.mass === 'lumped' ? 'Diagonal: never a negative correlation, but two to three times the error.' : 'Two to three times more accurate than lumped.'}>
          {(attributes) => (
            <select {...attributes} className="input" value={draft.mass} onChange={(e) => set('mass', e.target.value as Draft['mass'])}>
              <option value="consistent">consistent</option>
              <option value="lumped">lumped</option>
            </select>
          )}
        </Field>
        {draft.kind === 'vector' && (
          <Field label="Rotational share, 0 to 1" hint="Of the variance: 1 is purely rotational, 0 purely divergent." error={error('rotationalShare')}>
            {(attributes) => <input {...attributes} className="input text-right" inputMode="decimal" value={draft.rotationalShare} onChange={(e) => set('rotationalShare', e.target.value)} />}
          </Field>
        )}
        <Field label="Radius of the sphere, km" hint="For longitude and latitude; plane coordinates need none." error={error('sphereRadiusKm')}>
          {(attributes) => <input {...attributes} className="input text-right" inputMode="decimal" value={draft.sphereRadiusKm} onChange={(e) => set('sphereRadiusKm', e.target.value)} />}
        </Field>
      </fieldset>
      <div className="flex gap-3">
        <button className="btn btn-primary" disabled={submit.isSending}>
          {submit.isSending ? 'Saving …' : study ? 'Save changes' : 'Create study'}
        </button>
        <a className="btn" href={study ? `/studies/${study.id}` : `/teams/${teamId}`}>
          Cancel
        </a>
      </div>
    </form>
  );
};
