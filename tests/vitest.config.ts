import { fileURLToPath } from 'node:url';

import { defineConfig } from 'vitest/config';

const root = fileURLToPath(new URL('..', import.meta.url));
const nightly = process.env['SELVAGE_NIGHTLY'] === '1';
const files = (...folders: string[]) =>
  folders.flatMap((folder) => [`tests/${folder}/**/*.test.ts`, ...(nightly ? [`tests/${folder}/**/*.nightly.test.ts`] : [])]);
const exclude = ['node_modules/**', 'dist/**', ...(nightly ? [] : ['tests/**/*.nightly.test.ts'])];

export default defineConfig({
  root,
  test: {
    root,
    projects: [
      {
        root,
        test: { name: 'unit', root, include: files('unit'), exclude, environment: 'node', testTimeout: 30_000 },
      },
      {
        root,
        test: { name: 'reference', root, include: files('reference'), exclude, environment: 'node', testTimeout: 60_000 },
      },
      {
        root,
        test: {
          name: 'integration',
          root,
          include: files('integration'),
          exclude,
          environment: 'node',
          globalSetup: ['tests/support/database-cluster.ts'],
          pool: 'forks',
          testTimeout: 60_000,
          hookTimeout: 60_000,
        },
      },
    ],
  },
});
