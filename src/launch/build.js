// Builds web server, worker, command line and maintenance commands into dist/<hash of the sources>/.
import { spawnSync } from 'node:child_process';
import { createHash } from 'node:crypto';
import fs from 'node:fs';
import path from 'node:path';
import { pathToFileURL } from 'node:url';

import { StartError } from '../../db/private-postgres.js';
import { ROOT } from './settings.js';

const SOURCES = ['src', 'db', 'fixtures', 'public', 'astro.config.mjs', 'tsconfig.json', 'package.json', 'package-lock.json'];
const NOT_BUILT = new Set(['src/launch']);
const DIST = path.join(ROOT, 'dist');
/** Builds kept: a server that still runs loads parts of its own. */
const KEPT = 3;

/** Folder that a build of the present sources has, whether or not it is there. */
export function buildFolder() {
  const hash = createHash('sha256');
  for (const source of SOURCES) addToHash(hash, source);
  return path.join(DIST, hash.digest('hex').slice(0, 16));
}

/** The finished build of the present sources, or undefined. */
export function freshBuild() {
  const folder = buildFolder();
  return isBuilt(folder) ? folder : undefined;
}

/**
 * Builds when the sources changed.
 * @param {(message: string) => void} say
 * @returns {Promise<string>} the build's folder
 */
export async function ensureBuild(say) {
  const folder = buildFolder();
  if (isBuilt(folder)) {
    touch(folder);
    return folder;
  }
  say('Building (the sources changed) ...');
  const unfinished = `${folder}.${process.pid}`;
  try {
    fs.mkdirSync(DIST, { recursive: true });
    buildWeb(unfinished);
    await buildPrograms(unfinished);
    fs.writeFileSync(path.join(unfinished, 'built'), new Date().toISOString());
    if (!isBuilt(folder)) {
      fs.rmSync(folder, { recursive: true, force: true });
      fs.renameSync(unfinished, folder);
    }
  } catch (error) {
    if (error.code === 'EACCES' || error.code === 'EPERM')
      throw new StartError(`The folder ${DIST} cannot be written by this account. Start once as the owner of the checkout, who then builds for all, or make a checkout of your own.`, { cause: error });
    throw error;
  } finally {
    fs.rmSync(unfinished, { recursive: true, force: true });
  }
  removeOldBuilds(folder);
  return folder;
}

function buildWeb(folder) {
  const run = spawnSync(process.execPath, ['node_modules/astro/astro.js', 'build', '--silent', '--outDir', folder], {
    cwd: ROOT,
    env: { ...process.env, NODE_ENV: 'production', ASTRO_TELEMETRY_DISABLED: '1', ASTRO_DISABLE_UPDATE_CHECK: 'true' },
    encoding: 'utf8',
    maxBuffer: 64 * 1024 * 1024,
  });
  if (run.status !== 0 || !fs.existsSync(path.join(folder, 'server/entry.mjs')))
    throw new StartError(`The build failed:\n${`${run.stdout ?? ''}${run.stderr ?? ''}`.trim() || `astro build ended with ${run.status ?? run.signal}`}`);
}

async function buildPrograms(folder) {
  const { build } = await import('esbuild');
  const programs = { web: 'src/server/http/main.ts', 'worker/manage': 'src/worker/manage/main.ts', 'worker/main': 'src/worker/main.ts', 'cli/main': 'src/cli/main.ts' };
  const entryPoints = Object.entries(programs)
    .filter(([, source]) => fs.existsSync(path.join(ROOT, source)))
    .map(([out, source]) => ({ in: source, out }));
  for (const file of threadFiles()) entryPoints.push({ in: file, out: file.replace(/^src\//, '').replace(/\.ts$/, '') });
  try {
    await build({
      absWorkingDir: ROOT,
      entryPoints,
      outdir: folder,
      bundle: true,
      platform: 'node',
      target: 'node20',
      format: 'esm',
      packages: 'external',
      sourcemap: 'linked',
      sourcesContent: false,
      logLevel: 'silent',
    });
  } catch (error) {
    const first = error.errors?.[0];
    throw new StartError(`The build failed: ${first === undefined ? error.message : `${first.location?.file ?? ''}:${first.location?.line ?? ''} ${first.text}`}`, { cause: error });
  }
}

/** Files that run in threads of their own: every `*.thread.ts` beneath the worker and the command line. */
function threadFiles() {
  return ['src/worker', 'src/cli'].flatMap((folder) => listFiles(folder)).filter((file) => file.endsWith('.thread.ts'));
}

function removeOldBuilds(current) {
  const builds = fs
    .readdirSync(DIST, { withFileTypes: true })
    .filter((entry) => entry.isDirectory() && /^[0-9a-f]{16}$/.test(entry.name))
    .map((entry) => path.join(DIST, entry.name))
    .filter((folder) => folder !== current)
    .sort((a, b) => fs.statSync(b).mtimeMs - fs.statSync(a).mtimeMs);
  for (const old of builds.slice(KEPT - 1)) fs.rmSync(old, { recursive: true, force: true });
}

function addToHash(hash, relative) {
  for (const file of listFiles(relative)) {
    hash.update(`${file}\0`);
    hash.update(fs.readFileSync(path.join(ROOT, file)));
    hash.update('\0');
  }
}

function listFiles(relative) {
  if (NOT_BUILT.has(relative)) return [];
  const full = path.join(ROOT, relative);
  if (!fs.existsSync(full)) return [];
  if (!fs.statSync(full).isDirectory()) return [relative];
  return fs
    .readdirSync(full)
    .sort()
    .flatMap((name) => listFiles(`${relative}/${name}`));
}

const isBuilt = (folder) => fs.existsSync(path.join(folder, 'built'));

function touch(folder) {
  try {
    fs.utimesSync(folder, new Date(), new Date());
  } catch {
    // Another account's build: it keeps its age.
  }
}

if (process.argv[1] !== undefined && import.meta.url === pathToFileURL(process.argv[1]).href) {
  ensureBuild(console.log).then(
    (folder) => console.log(path.relative(ROOT, folder)),
    (error) => {
      console.error(error instanceof StartError ? error.message : error);
      process.exitCode = 1;
    },
  );
}
