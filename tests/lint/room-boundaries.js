// The table of who may import whom, as a lint rule: one row a room, and what the message says about where code belongs.
import { builtinModules } from 'node:module';
import path from 'node:path';

/** Folders to rooms; the longest match counts. */
const ROOMS = {
  'src/core/geometry': 'core/geometry',
  'src/core/sparse': 'core/sparse',
  'src/core/fem': 'core/fem',
  'src/core': 'core',
  'src/schemas': 'schemas',
  'src/client': 'client',
  'src/components': 'components',
  'src/layouts': 'layouts',
  'src/styles': 'styles',
  'src/pages': 'pages',
  'src/middleware.ts': 'pages',
  'src/server': 'server',
  'src/worker': 'worker',
  'src/cli': 'cli',
  'src/launch': 'launch',
  db: 'db',
  fixtures: 'fixtures',
  tests: 'tests',
};

const ALIASES = {
  '#core/': 'src/core/',
  '#schemas/': 'src/schemas/',
  '#client/': 'src/client/',
  '#components/': 'src/components/',
  '#layouts/': 'src/layouts/',
  '#styles/': 'src/styles/',
  '#server/': 'src/server/',
  '#worker/': 'src/worker/',
  '#db/': 'db/',
  '#fixtures/': 'fixtures/',
  '#support/': 'tests/support/',
};

const CORE = ['core', 'core/geometry', 'core/sparse', 'core/fem'];
const PURE = ['delaunator', 'd3-delaunay', 'robust-predicates', '@kninnug/constrainautor', 'ml-matrix', 'fflate'];
const SERVER_ONLY = ['sequelize', 'pg', 'pg-boss', 'umzug', 'pino', 'piscina', 'iron-session', '@node-rs/argon2', '@fastify/busboy', 'send', 'compression', 'h5wasm'];
const REACT = ['react', 'react-dom', '@react-three/fiber'];

/** `rooms`: what may be imported besides the room itself. `packages`: only these; `not`: all but these. */
const TABLE = {
  core: { rooms: CORE, packages: PURE, node: false, advice: 'Core is the same in browser, worker, server and command line: it may import core and small pure packages. Let the caller pass in what it needs.' },
  'core/geometry': { rooms: ['core:errors'], packages: PURE, node: false, advice: 'Geometry knows nobody. Code that needs matrices or correlation belongs in src/core/fem, correlation or design.' },
  'core/sparse': { rooms: ['core:errors'], packages: PURE, node: false, advice: 'Sparse matrices know nobody. Code that needs a mesh belongs in src/core/fem.' },
  'core/fem': { rooms: ['core/geometry', 'core/sparse', 'core:errors'], packages: PURE, node: false, advice: 'Finite elements know geometry and sparse alone. Code that needs more belongs in src/core/correlation or findings.' },
  schemas: { rooms: CORE, packages: ['zod'], node: false, advice: 'Schemas are the contract of both sides: Zod and core types only.' },
  client: { rooms: [...CORE, 'schemas', 'fixtures'], not: [...SERVER_ONLY, ...REACT], node: false, advice: 'Browser code without React lives here. React belongs in src/components, data access in src/server behind /api/v1.' },
  components: { rooms: [...CORE, 'schemas', 'client', 'styles'], not: SERVER_ONLY, node: false, advice: 'Components get data from /api/v1 (src/client) or as properties. Queries belong in src/server, and the page hands their result over.' },
  layouts: { rooms: [...CORE, 'schemas', 'client', 'components', 'styles'], not: SERVER_ONLY, node: false, advice: 'Layouts get data as properties. Queries belong in src/server, called by the page.' },
  styles: { rooms: [], advice: 'Styles import nothing.' },
  pages: { rooms: ['server', 'schemas', 'components', 'layouts', 'styles', 'client'], not: ['sequelize', 'pg', 'pg-boss', 'umzug', 'piscina', ...PURE], advice: 'Pages and endpoints parse, call a service and respond. Queries belong in src/server, numerical work in src/core called by the worker.' },
  server: { rooms: [...CORE, 'schemas', 'db', 'fixtures'], not: REACT, astro: false, advice: 'Services also run in the worker and on the command line, outside Astro. Page logic belongs in src/pages, browser code in src/client.' },
  worker: { rooms: [...CORE, 'schemas', 'db', 'server', 'fixtures'], not: REACT, astro: false, advice: 'The worker runs outside Astro. Page logic belongs in src/pages, browser code in src/client.' },
  cli: { rooms: [...CORE, 'schemas', 'db', 'server', 'worker', 'fixtures'], not: REACT, astro: false, advice: 'The command line runs outside Astro. Page logic belongs in src/pages, browser code in src/client.' },
  db: { rooms: ['schemas', 'fixtures'], not: REACT, astro: false, advice: 'The database is handed its settings and knows no service. Code that needs one belongs in src/server.' },
  launch: { rooms: ['db'], packages: ['esbuild'], astro: false, advice: 'The launcher runs before packages are installed: Node alone, and the private PostgreSQL of db/. What needs packages belongs in src/worker/manage.' },
  fixtures: { rooms: [...CORE, 'schemas'], not: REACT, astro: false, advice: 'Generators of sample data use core and schemas alone.' },
};

const NODE = new Set(builtinModules);

/** @type {import('eslint').Rule.RuleModule} */
export const roomBoundaries = {
  meta: { type: 'problem', schema: [], messages: { forbidden: '{{from}} may not import {{what}}. {{advice}}' } },
  create(context) {
    const file = path.relative(context.cwd, context.filename).split(path.sep).join('/');
    const from = roomOf(file);
    const row = from === undefined ? undefined : TABLE[from];
    if (row === undefined) return {};
    const check = (node) => {
      const source = node?.source;
      if (source?.type !== 'Literal' || typeof source.value !== 'string') return;
      const what = offence(source.value, file, from, row);
      if (what !== undefined) context.report({ node: source, messageId: 'forbidden', data: { from, what, advice: row.advice } });
    };
    return { ImportDeclaration: check, ExportAllDeclaration: check, ExportNamedDeclaration: check, ImportExpression: check };
  },
};

/** Words for what is wrong with the import, or undefined. */
function offence(specifier, file, from, row) {
  const target = targetOf(specifier, file);
  if (target !== undefined) {
    const room = roomOf(target);
    if (from === 'launch' && room === 'db') return target === 'db/private-postgres.js' ? undefined : target;
    if (room === undefined || room === from || row.rooms.includes(room)) return undefined;
    const isErrors = /^src\/core\/errors(\.ts)?$/.test(target) && row.rooms.includes('core:errors');
    return isErrors ? undefined : target;
  }
  if (/^astro:/.test(specifier)) return row.astro === false || row.node === false ? specifier : undefined;
  const name = specifier.startsWith('@') ? specifier.split('/').slice(0, 2).join('/') : specifier.split('/')[0];
  if (specifier.startsWith('node:') || NODE.has(name)) return row.node === false ? specifier : undefined;
  if (row.packages !== undefined && !row.packages.includes(name)) return specifier;
  return row.not?.includes(name) ? specifier : undefined;
}

function targetOf(specifier, file) {
  if (specifier.startsWith('.')) return path.posix.join(path.posix.dirname(file), specifier);
  const alias = Object.keys(ALIASES).find((one) => specifier.startsWith(one));
  return alias === undefined ? undefined : ALIASES[alias] + specifier.slice(alias.length);
}

function roomOf(file) {
  const folder = Object.keys(ROOMS)
    .filter((one) => file === one || file.startsWith(`${one}/`))
    .sort((a, b) => b.length - a.length)[0];
  return folder === undefined ? undefined : ROOMS[folder];
}
