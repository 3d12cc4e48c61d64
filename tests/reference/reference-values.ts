import { readFileSync } from 'node:fs';

/** Values of `fixtures/reference`, each file with its source and tolerance. */
export const referenceValues = (name: string): any =>
  JSON.parse(readFileSync(new URL(`../../fixtures/reference/${name}.json`, import.meta.url), 'utf8'));
