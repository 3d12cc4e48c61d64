// What has to be on the machine before anything of ours can run: Node, npm packages, Debian packages.
import { spawnSync } from 'node:child_process';
import { createHash } from 'node:crypto';
import fs from 'node:fs';
import path from 'node:path';

import { findPostgres, StartError } from '../../db/private-postgres.js';
import { ROOT } from './settings.js';

/** @throws {StartError} when this Node is older than package.json asks for */
export function checkNode() {
  const wanted = JSON.parse(fs.readFileSync(path.join(ROOT, 'package.json'), 'utf8')).engines.node.replace(/[^\d.]/g, '');
  const [major, minor] = wanted.split('.').map(Number);
  const [hasMajor, hasMinor] = process.versions.node.split('.').map(Number);
  if (hasMajor < major || (hasMajor === major && hasMinor < minor))
    throw new StartError(`Node ${process.versions.node} is too old: Selvage needs Node ${wanted} or newer.`);
}

/** Runs `npm ci` when node_modules is missing or is not what the lock file says. */
export function ensurePackages(say) {
  const lockFile = path.join(ROOT, 'package-lock.json');
  const installed = path.join(ROOT, 'node_modules');
  const marker = path.join(installed, '.selvage-installed');
  const lock = fs.readFileSync(lockFile, 'utf8');
  const stamp = createHash('sha256').update(lock).update(`${process.platform} ${process.arch} ${process.versions.modules}`).digest('hex');
  if (readIfThere(marker) === stamp) return;
  if (!matchesLock(lock, readIfThere(path.join(installed, '.package-lock.json')))) {
    say('Installing npm packages (npm ci) ...');
    const npm = process.env.npm_execpath;
    const [program, first] = npm !== undefined && /\.c?js$/.test(npm) ? [process.execPath, [npm]] : ['npm', []];
    const run = spawnSync(program, [...first, 'ci', '--include=dev', '--no-audit', '--no-fund', '--loglevel=error'], {
      cwd: ROOT,
      stdio: ['ignore', 'inherit', 'inherit'],
    });
    if (run.status !== 0)
      throw new StartError('The npm packages could not be installed. What npm said stands above; when it is about the network or about rights, solve that and start again.');
  }
  try {
    fs.writeFileSync(marker, stamp);
  } catch {
    // Another account's checkout: the comparison is made again at the next start.
  }
}

/** Whether what npm recorded as installed is what the lock file asks for (packages of other platforms left out). */
function matchesLock(lock, recorded) {
  if (recorded === undefined) return false;
  const has = JSON.parse(recorded).packages;
  return Object.entries(JSON.parse(lock).packages).every(
    ([where, wanted]) => where === '' || wanted.link || has[where]?.version === wanted.version || (has[where] === undefined && (wanted.optional || wanted.peer)),
  );
}

/** Finds PostgreSQL server programs, or installs Debian's when this account may. */
export function ensurePostgres(say, find = findPostgres) {
  if (find().length > 0) return;
  // Without this the package would create and start a cluster of its own, which nothing here needs.
  const keepOut = '/etc/postgresql-common/createcluster.d/selvage.conf';
  installDebian(['postgresql'], 'PostgreSQL', say, {
    before: `mkdir -p ${path.dirname(keepOut)} && echo 'create_main_cluster = false' > ${keepOut}`,
    after: `rm -f ${keepOut}`,
  });
  if (find().length === 0) throw new StartError('The package postgresql is installed, but its programs initdb and postgres were not found. Put their folder on PATH and start again.');
}

/** Path of Chromium; installs Debian's when it is missing and this account may. */
export function ensureChromium(say) {
  const find = () => [process.env.SELVAGE_CHROMIUM, '/usr/bin/chromium', '/usr/bin/chromium-browser'].find((file) => file !== undefined && fs.existsSync(file));
  if (find() === undefined) installDebian(['chromium'], 'Chromium', say);
  const file = find();
  if (file === undefined) throw new StartError('Chromium was not found. Install the package chromium, or set SELVAGE_CHROMIUM to its program.');
  return file;
}

function installDebian(packages, what, say, { before = 'true', after = 'true' } = {}) {
  const names = packages.join(' ');
  const asRoot = process.getuid?.() === 0 ? [] : ['sudo', '-n'];
  const may = asRoot.length === 0 || spawnSync('sudo', ['-n', 'true'], { stdio: 'ignore' }).status === 0;
  const hasApt = fs.existsSync('/usr/bin/apt-get');
  if (!may || !hasApt)
    throw new StartError(
      hasApt
        ? `${what} is missing and this account may not install packages. Ask an administrator to run: apt-get install --no-install-recommends ${names}`
        : `${what} is missing. Install it with your system's package manager (in Debian the package is called ${names}) and start again.`,
    );
  say(`Installing ${what} from Debian's packages (${names}) ...`);
  const script = `${before}; export DEBIAN_FRONTEND=noninteractive
    get() { apt-get -q -y -o DPkg::Lock::Timeout=300 install --no-install-recommends ${names}; }
    get || { apt-get -q update && get; }; status=$?
    ${after}; exit $status`;
  const [program, ...args] = [...asRoot, 'sh', '-c', script];
  const run = spawnSync(program, args, { encoding: 'utf8', maxBuffer: 64 * 1024 * 1024 });
  if (run.status !== 0) {
    const said = `${run.stdout ?? ''}${run.stderr ?? ''}`.trim().split('\n').slice(-6).join('\n');
    throw new StartError(`${what} could not be installed (apt-get install ${names}). The end of what apt-get said:\n${said}`);
  }
}

function readIfThere(file) {
  try {
    return fs.readFileSync(file, 'utf8');
  } catch {
    return undefined;
  }
}
