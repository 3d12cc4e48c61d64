import { type ReactNode, useId } from 'react';

interface FieldProps {
  label: string;
  hint?: ReactNode;
  error?: string | undefined;
  /** Gets the attributes that tie the control to label, hint and error. */
  children: (attributes: { id: string; 'aria-describedby': string | undefined; 'aria-invalid': boolean | undefined }) => ReactNode;
}

/** A labelled form control with its hint and what is wrong with it. */
export const Field = ({ label, hint, error, children }: FieldProps) => {
  const id = useId();
  const describedBy = [hint && `${id}-hint`, error && `${id}-error`].filter(Boolean).join(' ') || undefined;
  return (
    <div>
      <label className="label" htmlFor={id}>
        {label}
      </label>
      {children({ id, 'aria-describedby': describedBy, 'aria-invalid': error ? true : undefined })}
      {hint && (
        <p id={`${id}-hint`} className="hint mt-1">
          {hint}
        </p>
      )}
      {error && (
        <p id={`${id}-error`} className="field-error mt-1">
          {error}
        </p>
      )}
    </div>
  );
};
