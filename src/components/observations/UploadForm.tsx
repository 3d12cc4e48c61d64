import { type DragEvent, type FormEvent, useState } from 'react';

import { apiFetch } from '#client/api/fetch.ts';
import { formatBytes, formatCount, plural } from '#client/format.ts';
import { JobProgress } from '#components/ui/JobProgress.tsx';
import { Message } from '#components/ui/Message.tsx';
import { useSubmit } from '#components/ui/use-submit.ts';
import type { Job } from '#schemas/jobs.ts';
import type { Mapping } from '#schemas/observation-sets.ts';

import { MappingFields } from './MappingFields.tsx';
import { type FilePreview, previewFile } from './preview-file.ts';

interface UploadFormProps {
  studyId: string;
  limitBytes: number;
}

interface Chosen {
  file: File;
  preview: FilePreview;
}

/** Choosing a file, mapping its columns, sending it, and what became of it. */
export const UploadForm = ({ studyId, limitBytes }: UploadFormProps) => {
  const [chosen, setChosen] = useState<Chosen | null>(null);
  const [mapping, setMapping] = useState<Mapping | null>(null);
  const [name, setName] = useState('');
  const [badFile, setBadFile] = useState<string | null>(null);
  const [job, setJob] = useState<Job | null>(null);
  const [isOver, setOver] = useState(false);
  const submit = useSubmit();

  const choose = async (file: File | undefined) => {
    setChosen(null);
    setBadFile(null);
    setJob(null);
    if (!file) return;
    if (file.size > limitBytes) {
      setBadFile(`${file.name} has ${formatBytes(file.size)}; an upload may have ${formatBytes(limitBytes)}. Split it, or leave out rows that are not needed.`);
      return;
    }
    try {
      const preview = await previewFile(file);
      setChosen({ file, preview });
      setMapping(preview.mapping);
      setName(file.name.replace(/\.[^.]+$/, ''));
    } catch (error) {
      setBadFile(`${file.name}: ${error instanceof Error ? error.message : String(error)}`);
    }
  };
  const handleDrop = (event: DragEvent) => {
    event.preventDefault();
    setOver(false);
    void choose(event.dataTransfer.files[0]);
  };
  const handleSubmit = async (event: FormEvent) => {
    event.preventDefault();
    if (!chosen || !mapping) return;
    const form = new FormData();
    form.set('name', name);
    form.set('mapping', JSON.stringify(mapping));
    form.set('file', chosen.file);
    await submit.run(async () => setJob((await (await apiFetch(`/api/v1/studies/${studyId}/observation-sets`, { method: 'POST', body: form })).json()) as Job));
  };

  if (job && (job.state === 'queued' || job.state === 'running')) return <JobProgress job={job} onEnd={setJob} />;
  if (job?.state === 'complete') return <UploadResult job={job} studyId={studyId} />;
  const needsCoordinates = chosen?.preview.format === 'csv' && (mapping?.x === undefined || mapping.y === undefined);
  return (
    <div className="grid gap-6">
      {job?.state === 'failed' && <Message kind="fail">{job.error?.message} Nothing was kept.</Message>}
      {job?.state === 'cancelled' && <Message kind="note">The upload was cancelled. Nothing was kept.</Message>}
      {badFile && <Message kind="fail">{badFile}</Message>}
      <label
        className={`grid cursor-pointer place-items-center gap-2 border-2 border-dashed p-8 text-center ${isOver ? 'border-woad bg-woad-wash' : 'border-line-strong bg-linen-raised'}`}
        onDragOver={(event) => {
          event.preventDefault();
          setOver(true);
        }}
        onDragLeave={() => setOver(false)}
        onDrop={handleDrop}
      >
        <span>
          <span className="font-bold">Choose a file</span> or drop it here
        </span>
        <span className="hint">CSV, TSV or GeoJSON, up to {formatBytes(limitBytes)}</span>
        <input type="file" className="max-w-full" accept=".csv,.tsv,.txt,.json,.geojson,text/csv,application/geo+json" onChange={(event) => void choose(event.target.files?.[0])} />
      </label>
      {chosen && mapping && (
        <form onSubmit={handleSubmit} className="grid gap-6" noValidate>
          {submit.failure && <Message kind="fail">{submit.failure}</Message>}
          <p>
            <span className="font-bold">{chosen.file.name}</span> <span className="text-ink-soft">{formatBytes(chosen.file.size)}, {chosen.preview.format === 'csv' ? 'delimited text' : 'GeoJSON'}</span>
          </p>
          <div className="max-w-md">
            <label className="label" htmlFor="set-name">Name of the observation set</label>
            <input id="set-name" className="input" value={name} maxLength={120} onChange={(event) => setName(event.target.value)} />
          </div>
          <MappingFields preview={chosen.preview} mapping={mapping} onChange={setMapping} />
          <Preview preview={chosen.preview} mapping={mapping} />
          {needsCoordinates && <Message kind="warn">Say which columns hold {mapping.coordinates === 'lonlat' ? 'longitude and latitude' : 'x and y'}.</Message>}
          <div>
            <button className="btn btn-primary" disabled={submit.isSending || needsCoordinates}>
              {submit.isSending ? 'Sending …' : 'Upload and read'}
            </button>
          </div>
        </form>
      )}
    </div>
  );
};

const ROLE_WORDS: [keyof Mapping, string][] = [
  ['x', 'x'], ['y', 'y'], ['value', 'value'], ['value2', 'second component'], ['errorSd', 'error sd'], ['time', 'time'], ['level', 'level'], ['station', 'station'], ['flag', 'quality flag'],
];

const roleOf = (mapping: Mapping, key: number | string): string =>
  ROLE_WORDS.filter(([field]) => mapping[field] === key)
    .map(([field, word]) => (field === 'x' && mapping.coordinates === 'lonlat' ? 'longitude' : field === 'y' && mapping.coordinates === 'lonlat' ? 'latitude' : word))
    .join(', ');

const Preview = ({ preview, mapping }: { preview: FilePreview; mapping: Mapping }) => {
  if (preview.rows.length === 0) return <p className="hint">The first rows of a file this large are not shown; its properties are matched by their names.</p>;
  return (
    <div className="overflow-x-auto border border-line" tabIndex={0} role="region" aria-label="First rows of the file">
      <table className="table">
        <thead>
          <tr>
            {preview.columns.map(({ key, name }) => (
              <th key={key} scope="col" className="first:pl-3!">
                {name}
                <span className="block font-normal text-woad">{roleOf(mapping, key) || '–'}</span>
              </th>
            ))}
          </tr>
        </thead>
        <tbody>
          {preview.rows.slice(0, 8).map((row, k) => (
            <tr key={k}>
              {preview.columns.map(({ key }, c) => (
                <td key={key} className="max-w-48 truncate first:pl-3!">
                  {row[c]}
                </td>
              ))}
            </tr>
          ))}
        </tbody>
      </table>
    </div>
  );
};

interface UploadFigures {
  observationSetId: string;
  rowsRead: number;
  accepted: number;
  rejectedCount: number;
}

const UploadResult = ({ job, studyId }: { job: Job; studyId: string }) => {
  const result = job.result as unknown as UploadFigures;
  return (
    <div className="grid gap-5">
      <Message kind={result.rejectedCount > 0 ? 'warn' : 'pass'}>
        {plural(result.rowsRead, 'row')} read, {formatCount(result.accepted)} kept, {formatCount(result.rejectedCount)} rejected.
        {result.rejectedCount > 0 && ' Every rejected row is listed with its line and the reason.'}
      </Message>
      <div className="flex flex-wrap gap-3">
        <a className="btn btn-primary" href={`/observation-sets/${result.observationSetId}`}>
          Look at the observation set
        </a>
        {result.rejectedCount > 0 && (
          <a className="btn" href={`/observation-sets/${result.observationSetId}#rejected`}>
            Rejected rows
          </a>
        )}
        <a className="btn" href={`/studies/${studyId}`}>
          Back to the study
        </a>
      </div>
    </div>
  );
};
