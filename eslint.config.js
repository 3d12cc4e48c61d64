import js from '@eslint/js';
import astro from 'eslint-plugin-astro';
import reactHooks from 'eslint-plugin-react-hooks';
import globals from 'globals';
import tseslint from 'typescript-eslint';

import { noRawColours } from './tests/lint/no-raw-colours.js';
import { roomBoundaries } from './tests/lint/room-boundaries.js';

const selvage = { rules: { 'room-boundaries': roomBoundaries, 'no-raw-colours': noRawColours } };

export default tseslint.config(
  { ignores: ['dist/', 'node_modules/', '.astro/', '.selvage/', 'test-results/', 'coverage/'] },
  js.configs.recommended,
  ...tseslint.configs.strict,
  ...astro.configs['flat/recommended'],
  {
    plugins: { selvage },
    rules: {
      'selvage/room-boundaries': 'error',
      eqeqeq: ['error', 'always'],
      'no-console': 'error',
      'no-restricted-globals': ['error', { name: 'event', message: 'Take the event from the handler.' }],
      'object-shorthand': 'error',
      'prefer-const': 'error',
      '@typescript-eslint/consistent-type-imports': ['error', { fixStyle: 'inline-type-imports', disallowTypeAnnotations: false }],
      '@typescript-eslint/no-unused-vars': ['error', { argsIgnorePattern: '^_', varsIgnorePattern: '^_', caughtErrorsIgnorePattern: '^_' }],
      // Typed arrays read `number`, and an index proven in range needs no branch.
      '@typescript-eslint/no-non-null-assertion': 'off',
      '@typescript-eslint/no-empty-function': 'off',
      '@typescript-eslint/no-invalid-void-type': 'off',
      '@typescript-eslint/no-extraneous-class': 'off',
      '@typescript-eslint/unified-signatures': 'off',
      '@typescript-eslint/no-dynamic-delete': 'off',
    },
  },
  {
    files: ['src/core/**', 'src/schemas/**'],
    rules: {
      'no-restricted-globals': [
        'error',
        ...['window', 'document', 'self', 'navigator', 'localStorage', 'fetch', 'process', 'Buffer', 'console', 'performance', 'setTimeout', 'setInterval', 'queueMicrotask'].map(
          (name) => ({ name, message: 'Core has no web, no Node and no clock: let the caller do it, through a callback.' }),
        ),
      ],
      'no-restricted-properties': [
        'error',
        { object: 'Math', property: 'random', message: 'Core is deterministic: take a seed.' },
        { object: 'Date', property: 'now', message: 'Core has no clock: the caller times phases.' },
      ],
    },
  },
  {
    files: ['src/core/design/**', 'src/core/geometry/**'],
    rules: {
      'no-restricted-syntax': [
        'error',
        {
          selector: "BinaryExpression[operator='**'][left.type!='Literal']",
          message: 'Not the same bits on every machine: multiply.',
        },
      ],
      'no-restricted-properties': [
        'error',
        ...['random', 'sin', 'cos', 'tan', 'asin', 'acos', 'atan', 'atan2', 'exp', 'log', 'pow', 'hypot'].map((property) => ({
          object: 'Math',
          property,
          message: 'Not the same bits on every machine: use src/core/geometry/deterministic-math.ts.',
        })),
        { object: 'Date', property: 'now', message: 'Core has no clock: the caller times phases.' },
      ],
    },
  },
  {
    files: ['src/components/**', 'src/pages/**', 'src/layouts/**'],
    rules: { 'selvage/no-raw-colours': 'error' },
  },
  {
    files: ['src/server/**', 'src/worker/**', 'src/cli/**', 'db/**', 'src/middleware.ts', 'src/pages/api/**'],
    rules: {
      'no-restricted-syntax': [
        'error',
        { selector: "MemberExpression[object.type='MetaProperty'][property.name='env']", message: 'import.meta.env is baked into the build: settings come from src/server/env.ts.' },
      ],
    },
  },
  {
    files: ['src/server/**/*.ts', 'src/worker/**/*.ts', 'src/cli/**/*.ts', 'db/**/*.ts', 'src/pages/api/**/*.ts'],
    languageOptions: { parserOptions: { projectService: true } },
    rules: {
      '@typescript-eslint/no-floating-promises': 'error',
      '@typescript-eslint/no-misused-promises': ['error', { checksVoidReturn: false }],
    },
  },
  {
    files: ['src/components/**/*.{ts,tsx}'],
    plugins: { 'react-hooks': reactHooks },
    rules: { 'react-hooks/rules-of-hooks': 'error', 'react-hooks/exhaustive-deps': 'error' },
  },
  {
    files: ['**/*.astro'],
    rules: { 'astro/no-unsafe-inline-scripts': 'error' },
  },
  {
    files: ['src/client/**', 'src/components/**', 'src/layouts/**', 'src/pages/**', 'public/**'],
    languageOptions: { globals: { ...globals.browser, ...globals.worker } },
  },
  {
    files: ['src/launch/**', 'src/cli/**', 'src/worker/manage/**', 'src/server/http/main.ts', 'db/private-postgres.js', 'db/seeders/**', 'fixtures/**', 'tests/**', '*.config.*'],
    languageOptions: { globals: globals.node },
    rules: { 'no-console': 'off' },
  },
  {
    files: ['tests/**'],
    rules: { '@typescript-eslint/no-explicit-any': 'off' },
  },
);
