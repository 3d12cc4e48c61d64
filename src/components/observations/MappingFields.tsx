import { Field } from '#components/ui/Field.tsx';
import type { Mapping } from '#schemas/observation-sets.ts';

import type { FilePreview } from './preview-file.ts';

type ColumnField = 'x' | 'y' | 'value' | 'value2' | 'errorSd' | 'time' | 'level' | 'station' | 'flag';

const OPTIONAL: { field: ColumnField; label: string }[] = [
  { field: 'value', label: 'Value, or first component' },
  { field: 'value2', label: 'Second component' },
  { field: 'errorSd', label: 'Error standard deviation' },
  { field: 'time', label: 'Time' },
  { field: 'level', label: 'Level' },
  { field: 'station', label: 'Station' },
  { field: 'flag', label: 'Quality flag' },
];

interface MappingFieldsProps {
  preview: FilePreview;
  mapping: Mapping;
  onChange: (mapping: Mapping) => void;
}

/** Which column is what, and in which unit. */
export const MappingFields = ({ preview, mapping, onChange }: MappingFieldsProps) => {
  const set = (field: keyof Mapping, value: unknown) => {
    const next: Record<string, unknown> = { ...mapping, [field]: value };
    if (value === undefined) delete next[field];
    onChange(next as Mapping);
  };
  const columnSelect = (field: ColumnField, label: string, emptyWord: string) => (
    <Field key={field} label={label}>
      {(attributes) => (
        <select
          {...attributes}
          className="input"
          value={mapping[field] === undefined ? '' : String(preview.columns.findIndex(({ key }) => key === mapping[field]))}
          onChange={(event) => set(field, event.target.value === '' ? undefined : preview.columns[Number(event.target.value)].key)}
        >
          <option value="">{emptyWord}</option>
          {preview.columns.map(({ key, name }, k) => (
            <option key={key} value={k}>
              {name}
            </option>
          ))}
        </select>
      )}
    </Field>
  );
  const isLonLat = mapping.coordinates === 'lonlat';
  return (
    <fieldset className="grid gap-4 sm:grid-cols-2 lg:grid-cols-4">
      <legend className="mb-3 font-bold">Columns</legend>
      <Field label="Coordinates">
        {(attributes) => (
          <select {...attributes} className="input" value={mapping.coordinates} onChange={(event) => set('coordinates', event.target.value)}>
            <option value="lonlat">longitude, latitude</option>
            <option value="plane">projected x, y</option>
          </select>
        )}
      </Field>
      {!isLonLat && (
        <Field label="Unit of x and y">
          {(attributes) => (
            <select {...attributes} className="input" value={mapping.planeUnit} onChange={(event) => set('planeUnit', event.target.value)}>
              <option value="km">km</option>
              <option value="m">m</option>
            </select>
          )}
        </Field>
      )}
      {preview.format === 'csv' && columnSelect('x', isLonLat ? 'Longitude' : 'x', 'choose')}
      {preview.format === 'csv' && columnSelect('y', isLonLat ? 'Latitude' : 'y', 'choose')}
      {OPTIONAL.map(({ field, label }) => columnSelect(field, label, 'none'))}
    </fieldset>
  );
};
